"""Tables as spreadsheets save them."""

import pytest

from planner.absorption.tables import band_heading, read_table, rows_of
from planner.errors import CatalogueError, InputError


@pytest.mark.parametrize("heading", ["125", "125 Hz", "a125", "A125", "125hz"])
def test_band_headings(heading):
    assert band_heading(heading) == "a125"


@pytest.mark.parametrize("heading", ["1k", "1000", "1,000", "1 kHz", "a1000"])
def test_one_kilohertz(heading):
    assert band_heading(heading) == "a1000"


@pytest.mark.parametrize("heading", ["id", "126", "", "a", "width_m", "1.2.3"])
def test_other_headings_stay(heading):
    assert band_heading(heading) == heading.lower()


def test_semicolons_mean_decimal_commas():
    rows = rows_of("# saved by a spreadsheet\nid;125 Hz\nx;0,35\n\n")
    assert rows[0].number("a125") == pytest.approx(0.35)
    assert rows[0].line == 3


def test_commas_mean_decimal_points():
    rows = rows_of('id,a125,note\n"a, b",0.35,\nNA,,x\n')
    assert rows[0].text("id") == "a, b"
    assert rows[1].text("id") == "NA"  # a name, not a missing value
    assert rows[1].number("a125") is None
    with pytest.raises(ValueError, match="is not a number"):
        rows[1].number("note")


@pytest.mark.parametrize("cell", ["nan", "inf", "-inf", "1_0", "1e999", "0x1", "١"])
def test_only_plain_finite_numbers_are_numbers(cell):
    with pytest.raises(ValueError, match="is not a number"):
        rows_of(f"id,a125\nx,{cell}\n")[0].number("a125")


def test_what_spreadsheets_put_before_the_headings_is_skipped():
    """A comment in quotation marks, padded with separators; the hint that one of them writes for itself."""
    rows = rows_of('sep=;\n"# state: empty; dry";;;\n\nid;125 Hz;;\nx;0,35;;\n')
    assert rows[0].number("a125") == pytest.approx(0.35)
    assert rows[0].line == 5


def test_older_encodings_are_read(tmp_path):
    path = tmp_path / "table.csv"
    path.write_bytes("id,description\nx,Höhe\n".encode("cp1252"))
    assert read_table(path, ("id",))[0].text("description") == "Höhe"
    for encoding in ("utf-8-sig", "utf-16"):
        path.write_bytes("id,description\r\nx,Höhe\r\n".encode(encoding))
        assert read_table(path, ("id",))[0].text("description") == "Höhe"


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "no rows"),
        (b"id\n", "no rows"),
        (b"name\nx\n", "no column 'id'"),
        (b"x" * 6_000_000, "MB"),
        (b"id,note\nx,wool, soft\n", "line 2 has 3 cells under 2 headings"),
        (b"id,125,125 Hz\nx,0.1,0.2\n", "'a125' stands there twice"),
    ],
)
def test_what_is_no_table_is_refused(tmp_path, content, words):
    path = tmp_path / "table.csv"
    path.write_bytes(content)
    with pytest.raises(CatalogueError, match=words):
        read_table(path, ("id",), kind=CatalogueError)
    with pytest.raises(InputError, match="cannot be read"):
        read_table(tmp_path / "none.csv", ("id",))
