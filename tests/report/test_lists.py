"""The list adds up in every format, and hostile text stays text."""

import csv
import io
import zipfile

import openpyxl
import pytest

from planner.report.buying import number_ranges, placed_panels
from planner.report.list_formats import list_document, to_csv, to_text, to_xlsx
from planner.report.printing import write_list

LAYERS = {
    "wool-100": [{"layer": "porous", "thickness_mm": 100}, {"layer": "air", "thickness_mm": 50}]
}
# Seven panels in packs of four at 120, four in packs of three at 75.50, 4.2 m² in packs of 1.5 m²
# at 19.90: 2 · 120 + 2 · 75.5 + 3 · 19.9 = 450.70 by hand; the stand has no price.
TOTAL = "450.70"
HOSTILE = [
    "=HYPERLINK(\"x\")", "+1+1", "-2-3", "@SUM(A1)", "\t=1", "\r\n=1", "＝1", "</td><script>x",
    "#panic() $x$ *b*", "\u202eabc", "x" * 500, "\U0001f600 汉", "a,b;c\"d", "\x00\x07",
]  # fmt: skip


def test_every_line_and_the_total_stand_in_the_text(sample):
    text = to_text(sample.buying(build_ups=LAYERS))
    for words in (
        "P5–P11", "pieces 7", "2 × pack of 4", "5.04 m²", "100 mm thick", "45.5 kg", "240.00 EUR",
        "spare 12 %", "P1–P4", "151.00 EUR", "spare 33 %", "4.20 m²", "59.70 EUR",
        f"Total: {TOTAL} EUR (incomplete)", "12.12 m²", "price invented", "price missing",
        "second retentions", "Porous board", "no fire class declared",
    ):  # fmt: skip
        assert words in text


def test_csv_adds_up(sample):
    rows = list(csv.DictReader(io.StringIO(to_csv(sample.buying(build_ups=LAYERS)))))
    products = [row for row in rows if row["kind"] == "product"]
    (total,) = [row for row in rows if row["kind"] == "total"]
    assert sum(float(r["cost_EUR"]) for r in products if r["cost_EUR"]) == pytest.approx(450.70)
    assert float(total["cost_EUR"]) == pytest.approx(450.70)
    assert total["item"] == "total, incomplete"
    assert [r["packs"] for r in products] == ["2", "2", "3", "1"]
    assert {r["kind"] for r in rows} >= {"raw goods", "fixings", "take care", "assumed"}


def test_spreadsheet_holds_numbers_as_numbers_and_no_formula(sample):
    book = openpyxl.load_workbook(io.BytesIO(to_xlsx(sample.buying(build_ups=LAYERS))))
    rows = list(book.active.iter_rows(values_only=True))
    heads = list(rows[0])
    cost = heads.index("cost_EUR")
    costs = [row[cost] for row in rows[1:] if row[0] == "product"]
    assert costs == [240.0, 151.0, 59.7, None]
    (total,) = [row for row in rows if row[0] == "total"]
    assert total[cost] == 450.7
    assert all(cell.data_type != "f" for row in book.active.iter_rows() for cell in row)


@pytest.mark.parametrize("text", HOSTILE)
def test_hostile_text_runs_nowhere(text, sample):
    """No CSV cell begins like a formula, no spreadsheet cell is one, and the file opens."""
    buying = sample.buying(name=(text.strip("\x00\x07\r\n\t") or "x")[:200],
                           catalogue=sample.catalogue(description=text, fire_class_declared=text))  # fmt: skip
    for row in csv.reader(io.StringIO(to_csv(buying))):
        for cell in row:
            assert cell.lstrip()[:1] not in tuple("=+@＝＋－＠") or _is_number(cell)
            assert not cell.startswith("-") or _is_number(cell)
    data = to_xlsx(buying)
    sheet = openpyxl.load_workbook(io.BytesIO(data)).active
    assert all(cell.data_type != "f" for row in sheet.iter_rows() for cell in row)
    assert "<f>" not in zipfile.ZipFile(io.BytesIO(data)).read("xl/worksheets/sheet1.xml").decode()
    shown = "".join(c if c.isprintable() else " " for c in text).strip()
    assert shown in to_text(buying)
    assert any(cell.value == shown for cell in sheet["D"]) or not shown


def _is_number(cell):
    try:
        float(cell)
    except ValueError:
        return False
    return True


def test_identical_lists_give_identical_files(sample, tmp_path):
    for ending in ("pdf", "html", "csv", "xlsx", "txt"):
        paths = [tmp_path / f"{n}.{ending}" for n in "ab"]
        for path in paths:
            write_list(path, sample.buying(build_ups=LAYERS), timestamp=1_770_000_000)
        assert paths[0].read_bytes() == paths[1].read_bytes()


def test_panel_numbers_are_the_same_on_the_list_and_on_the_drawings(sample):
    """Ceiling, back, front: the order of the room's surfaces, then left to right, bottom to top."""
    option, room, catalogue = sample.option(), sample.room(), sample.catalogue()
    placed = placed_panels(option, catalogue, room)
    assert [panel.number for panel in placed] == [f"P{n}" for n in range(1, 12)]
    assert [panel.surface for panel in placed] == ["ceiling"] * 4 + ["back"] * 2 + ["front"] * 5
    places = [tuple(r) for item in option.items for r in item.placement]
    drawn = [(p.left, p.bottom, p.width, p.height) for p in placed]
    assert sorted(drawn) == sorted(places)
    lines = {line.item: line.panels for line in sample.buying().lines}
    assert lines["Invented wool-100"] == "P5–P11"
    assert lines["Invented cloud-50"] == "P1–P4"
    assert number_ranges([3]) == "P3"
    assert number_ranges([1, 2, 5, 3, 9]) == "P1–P3, P5, P9"


def test_panel_numbers_are_those_of_the_placement(sample):
    """Laid out by the placement, written into the option and read back: the same numbers."""
    placement = pytest.importorskip("planner.treat.placement")
    bare = sample.option()
    bare = bare.model_copy(
        update={"items": tuple(i.model_copy(update={"placement": ()}) for i in bare.items[:3])}
    )
    laid = placement.place(sample.room(), bare, sample.catalogue())
    drawn = placed_panels(laid.in_option(bare), sample.catalogue(), sample.room())
    assert laid.panels
    for panel, own in zip(laid.panels, drawn, strict=True):
        assert (f"P{panel.number}", panel.surface) == (own.number, own.surface)
        assert panel.rectangle == pytest.approx((own.left, own.bottom, own.width, own.height))


def test_rented_room_gets_no_fixings(sample):
    room = sample.room(treatment={"rented": True})
    buying = sample.buying(room=room)
    assert not buying.fixings
    assert any("nothing is screwed on" in entry for entry in buying.assumptions)


def test_imperial_list_is_imperial_throughout(sample):
    buying = sample.buying(units="ft", build_ups=LAYERS)
    document = list_document(buying)
    tables = [b for s in document.sections for b in s.blocks if hasattr(b, "rows")]
    cells = " ".join(cell for table in tables for row in table.rows for cell in row)
    assert "54.3 ft²" in cells  # 5.04 / 0.3048²
    assert "100.3 lb" in cells  # 45.5 / 0.45359237
    for metric in (" m²", " mm", " kg", " m "):
        assert metric not in f"{cells} "
