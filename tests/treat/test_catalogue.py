"""Catalogues: what is read, and that nothing wrong gets through or ends in a traceback."""

from __future__ import annotations

import numpy as np
import pytest

from planner.errors import CatalogueError
from planner.treat.catalogue import Catalogue, read_catalogue
from planner.treat.catalogue_file import products_from_bytes

HEAD = (
    "id,description,width_m,height_m,thickness_mm,gap_mm,mounting,surfaces,pack,price_per_pack,"
    "currency,weight_kg,fire_class_declared,a63,a125,a250,a500,a1000,a2000,a4000,a8000,u,source"
)
ROW = (
    "panel-50,Panel 50 mm,1.20,0.60,50,0,direct,wall;ceiling,4,180,EUR,4.5,B-s1 d0,,0.20,0.65,1.00,"
    "1.05,1.00,0.95,,0.05,invented for this test"
)


def cells(**changes: str) -> str:
    values = dict(zip(HEAD.split(","), ROW.split(","), strict=True)) | changes
    return HEAD + "\n" + ",".join(values.values()) + "\n"


def read(tmp_path, content: str | bytes) -> Catalogue:
    file = tmp_path / "catalogue.csv"
    file.write_bytes(content.encode() if isinstance(content, str) else content)
    return read_catalogue(file)


def test_a_row_is_read_as_written(tmp_path):
    """Each cell of the sample row arrives in its place, missing bands as assumed."""
    product = read(tmp_path, cells()).find("panel-50")
    assert (product.unit, product.width, product.height) == ("piece", 1.2, 0.6)
    assert product.piece_area == pytest.approx(0.72)
    assert (product.pack, product.price_per_pack, product.currency) == (4.0, 180.0, "EUR")
    assert (product.weight_kg, product.fire_class_declared) == (4.5, "B-s1 d0")
    assert product.surfaces == ("wall", "ceiling")
    assert product.coefficients.alpha[1:7] == pytest.approx([0.2, 0.65, 1.0, 1.05, 1.0, 0.95])
    assert product.coefficients.assumed.tolist() == [True] + [False] * 6 + [True]
    assert np.all(product.coefficients.u[1:7] == 0.05)
    assert product.price_is_invented


@pytest.mark.parametrize(
    ("name", "change"),
    [
        ("byte-order mark", lambda text: b"\xef\xbb\xbf" + text.encode()),
        ("carriage returns", lambda text: text.replace("\n", "\r\n").encode()),
        ("old line ends", lambda text: text.replace("\n", "\r").encode()),
        ("tabs", lambda text: text.replace(",", "\t").encode()),
        ("utf-16", lambda text: text.encode("utf-16")),
        ("remarks first", lambda text: b"# prices invented\n\n" + text.encode()),
        ("blank lines", lambda text: text.replace("\n", "\n\n").encode()),
        (
            "semicolons and decimal commas",
            lambda text: text.replace(";", "/").replace(",", ";").replace(".", ",").encode(),
        ),
    ],
)
def test_spreadsheets_of_all_sorts_read_alike(tmp_path, name, change):
    """However a spreadsheet saved it, the same numbers arrive."""
    plain = read(tmp_path, cells()).find("panel-50")
    other = read(tmp_path, change(cells())).find("panel-50")
    assert (other.width, other.weight_kg, other.price_per_pack) == (1.2, 4.5, 180.0)
    assert other.surfaces == plain.surfaces
    assert np.array_equal(other.coefficients.alpha, plain.coefficients.alpha)


def test_windows_letters_are_understood(tmp_path):
    """A file in Windows-1252 keeps its letters."""
    content = cells(description="Gehäuse für Höhen").encode("cp1252")
    assert read(tmp_path, content).find("panel-50").description == "Gehäuse für Höhen"


def test_goods_by_the_square_metre_and_free_standing_things(tmp_path):
    """Carpet has no size, a free-standing absorber counts by the piece and hides nothing."""
    head = "id,unit,surfaces,pack,price_per_pack,a125,a250,a500,a1000\n"
    catalogue = read(
        tmp_path,
        head + "carpet,m2,floor,2.5,50,0.05,0.1,0.2,0.4\ngobo,item,free,1,99,0.4,0.9,1.8,2.2\n",
    )
    assert catalogue.find("carpet").piece_area == 1.0
    assert catalogue.find("carpet").pack == 2.5
    assert catalogue.find("gobo").piece_area == 0.0
    assert catalogue.find("gobo").coefficients.alpha[4] == pytest.approx(2.2)
    assert not catalogue.find("gobo").needs_fixings


def test_coefficients_above_one_are_kept(tmp_path):
    """Laboratory values reach 1.3; only the formula that needs it caps them."""
    product = read(tmp_path, cells(a500="1.28")).find("panel-50")
    assert product.coefficients.alpha[3] == pytest.approx(1.28)


def test_an_unknown_product_names_the_nearest(tmp_path):
    with pytest.raises(CatalogueError, match="Nearest: panel-50"):
        read(tmp_path, cells()).find("panel50")


MALFORMED: list[tuple[str, str | bytes, str]] = [
    ("empty file", "", "is empty"),
    ("remarks only", "# nothing\n#\n", "is empty"),
    ("headings only", HEAD + "\n", "holds no product"),
    ("binary", b"\x00\x01\x02\xff" * 50, "not a text file"),
    ("zip", b"PK\x03\x04" + bytes(200), "not a text file"),
    ("broken utf-16", b"\xff\xfe\x00", "not a text file"),
    ("huge", b"a" * 2_100_000, "MB large"),
    ("huge cell", cells(source="x" * 200_000), "not a table|characters"),
    ("open quotation mark", HEAD + '\n"panel,1\n', "not a table"),
    ("no id column", "description,a125\nx,0.1\n", "no column 'id'"),
    ("heading misspelt", cells().replace("price_per_pack", "price_per_pakc"), "Did you mean"),
    ("heading twice", "id,id,a125\nx,x,0.1\n", "twice"),
    ("heading empty", "id,,a125\nx,y,0.1\n", "heading is empty"),
    ("too many cells", cells().rstrip() + ",1,2\n", "cells under"),
    ("id empty", cells(id=""), "column id.*empty"),
    ("id twice", cells() + ROW + "\n", "row 3.*stands in row 2"),
    ("id too long", cells(id="x" * 200), "characters"),
    ("control characters", cells(description="a\x07b"), "control characters"),
    ("width empty", cells(width_m=""), "width_m.*empty"),
    ("width in millimetres", cells(width_m="1200"), "In metres, 1200 mm are 1.2"),
    ("width negative", cells(width_m="-1"), "column width_m"),
    ("width with unit", cells(width_m="1.2 m"), "not a number"),
    ("width not finite", cells(width_m="inf"), "not a number"),
    ("width nan", cells(width_m="nan"), "not a number"),
    ("huge exponent", cells(width_m="1e99"), "column width_m"),
    ("underscore number", cells(width_m="1_2"), "not a number"),
    ("other digits", cells(width_m="١٢"), "not a number"),
    ("thickness negative", cells(thickness_mm="-5"), "column thickness_mm"),
    ("pack of half a piece", cells(pack="0.5"), "no pack"),
    ("pack of none", cells(pack="0"), "no pack"),
    ("price negative", cells(price_per_pack="-10"), "column price_per_pack"),
    ("price as a formula", cells(price_per_pack="=1+1"), "not a number"),
    ("price with thousands", cells(price_per_pack='"1,200.00"'), "not a number"),
    ("currency too long", cells(currency="some money"), "characters"),
    ("weight absurd", cells(weight_kg="99999"), "column weight_kg"),
    ("unknown surface", cells(surfaces="roof"), "no kind of surface"),
    ("panel standing free", cells(surfaces="free"), "does not go with"),
    ("coefficient in percent", cells(a500="85"), "write 0.85"),
    ("coefficient negative", cells(a500="-0.1"), "a500"),
    ("coefficient a word", cells(a500="high"), "a500.*not a number"),
    ("coefficient far too large", cells(a500="1000"), "a500"),
    ("no coefficient", "id,width_m,height_m\nx,1,1\n", "neither coefficients"),
    ("one coefficient", "id,width_m,height_m,a500\nx,1,1,0.8\n", "single-number"),
    ("two ways", "id,width_m,height_m,a500,material\nx,1,1,0.8,brick\n", "more than one way"),
    ("unknown material", "id,width_m,height_m,material\nx,1,1,no-such-thing-at-all\n", "material"),
    ("layers no list", "id,width_m,height_m,build_up\nx,1,1,5\n", "no list of layers"),
    ("layers not readable", "id,width_m,height_m,build_up\nx,1,1,[{\n", "cannot be read"),
    ("layers nested deep", "id,width_m,height_m,build_up\nx,1,1," + "[" * 1500 + "\n", "build_up"),
    ("uncertainty a word", cells(u="good"), "column u"),
    ("uncertainty too large", cells(u="3"), "column u"),
    ("uncertainty of two bands", cells(u="0.1 0.2"), "column u"),
    ("unit unknown", "id,unit,a125,a250,a500\nx,litre,0.1,0.1,0.1\n", "no unit of sale"),
]


@pytest.mark.parametrize(
    ("content", "match"), [case[1:] for case in MALFORMED], ids=[case[0] for case in MALFORMED]
)
def test_what_is_wrong_is_refused_with_its_place(tmp_path, content, match):
    """Every refusal is a CatalogueError that names the file and, where there is one, the row."""
    with pytest.raises(CatalogueError, match=f"(?s)catalogue.csv.*({match})"):
        read(tmp_path, content)


def test_a_missing_file_and_a_folder_are_refused(tmp_path):
    for path in (tmp_path / "none.csv", tmp_path):
        with pytest.raises(CatalogueError, match="cannot be read"):
            read_catalogue(path)


def test_all_wrong_rows_are_named_at_once():
    """A person fixes the file in one go, not error by error."""
    rows = "\n".join(ROW.replace("panel-50", f"p{n}").replace("1.20", "x") for n in range(3))
    with pytest.raises(CatalogueError, match=r"row 2 \(p0\).*Also wrong: row 3 \(p1\).*row 4"):
        products_from_bytes(f"{HEAD}\n{rows}\n".encode(), file="c.csv")


VARIED = "id,width_m,height_m,thickness_mm,gap_mm,pack,price_per_pack,weight_kg,build_up\n"


def test_one_row_offers_thicknesses_and_gaps():
    """Two thicknesses with prices of their own, three gaps: six products; a gap of 0 has no layer."""
    from planner.treat.cells import rows_of
    from planner.treat.variants import filled_in, variants

    text = VARIED + 'wool,1.2,0.6,50/100,0/50/100,1,30/48,3,"[]"\n'
    (row,) = rows_of(text, "c.csv", VARIED.strip().split(","))
    made = variants(row)
    assert [one.cells["id"] for one in made] == [
        "wool@50+0", "wool@50+50", "wool@50+100", "wool@100+0", "wool@100+50", "wool@100+100"
    ]  # fmt: skip
    assert [one.cells["price_per_pack"] for one in made] == ["30"] * 3 + ["48"] * 3
    assert {one.cells["weight_kg"] for one in made} == {"3"}
    layers = [{"kind": "wool", "thickness_mm": "thickness"}, {"kind": "air", "thickness_mm": "gap"}]
    assert filled_in(made[0], layers) == [{"kind": "wool", "thickness_mm": 50.0}]
    assert filled_in(made[5], layers) == [
        {"kind": "wool", "thickness_mm": 100.0},
        {"kind": "air", "thickness_mm": 100.0},
    ]


@pytest.mark.parametrize(
    ("line", "match"),
    [
        ('wool,1,1,50/100,0,1,30,3,""', "more than one value"),
        ('wool,1,1,50/100,0,1,30/40/50,3,"[]"', "3 values for 2 thicknesses"),
        ('wool,1,1,1/2/3/4/5/6/7/8,1/2/3/4/5/6/7/8,1,30,3,"[]"', "more than 40"),
        (
            "wool,1,1,50/100,,1,30,3,\"[{ kind = 'air', thickness_mm = 'gap' }]\"",
            "gap_mm.*is empty",
        ),
    ],
)
def test_choices_that_do_not_match_are_refused(tmp_path, line, match):
    with pytest.raises(CatalogueError, match=f"(?s)row 2.*({match})"):
        read(tmp_path, f"{VARIED}{line}\n")


@pytest.mark.slow
def test_no_mangled_catalogue_ends_in_a_traceback():
    """5000 random mutations of a good file are read or refused, nothing else."""
    rng = np.random.default_rng(5)
    good = bytearray(cells().encode() + ROW.replace("panel-50", "other").encode() + b"\n")
    refusals = []
    for _ in range(5000):
        data = bytearray(good)
        for _ in range(rng.integers(1, 6)):
            place = int(rng.integers(len(data)))
            match rng.integers(4):
                case 0:
                    data[place] = int(rng.integers(256))
                case 1:
                    del data[place : place + int(rng.integers(1, 30))]
                case 2:
                    data[place:place] = rng.choice([b",", b'"', b"\n", b";", b"-", b"e9", b"\0"])
                case _:
                    data[place:place] = data[: int(rng.integers(1, 60))]
        try:
            products_from_bytes(bytes(data), file="c.csv")
        except CatalogueError as error:
            refusals.append(str(error))
    assert len(refusals) > 1000
    assert all(text.startswith("c.csv") for text in refusals)


def test_layers_may_stand_in_a_cell_as_a_short_line():
    """The line and the list say the same: same coefficients, for every thickness and gap offered."""
    line = "porous thickness flow_resistivity=9000 + air gap"
    listed = (
        "[{layer='porous', thickness_mm='thickness', flow_resistivity=9000}, "
        "{layer='air', thickness_mm='gap'}]"
    )
    short, long = (
        products_from_bytes(f'{VARIED}wool,1.2,0.6,50/100,0/200,1,30,3,"{cell}"\n'.encode(), file="c.csv")
        for cell in (line, listed)
    )  # fmt: skip
    assert [one.id for one in short] == ["wool@50+0", "wool@50+200", "wool@100+0", "wool@100+200"]
    assert [one.build_up for one in short] == [one.build_up for one in long]
    assert (
        short[1].coefficients.alpha[1] > 2 * short[0].coefficients.alpha[1]
    )  # a gap is for the bass


def test_the_wrong_layer_of_a_build_up_is_named():
    row = 'wool,1.2,0.6,50,,1,30,3,"air 20 + porous 50"\n'
    with pytest.raises(
        CatalogueError, match=r"row 2 \(wool\), column build_up: layer 2 porous needs"
    ):
        products_from_bytes(f"{VARIED}{row}".encode(), file="c.csv")
