"""Tables that a person edits: what they say, and what they may not say."""

from pathlib import Path

import pytest

from planner.app.tables import (
    catalogue_rows,
    catalogue_text,
    cells,
    option_of,
    option_rows,
    separator,
)
from planner.errors import CatalogueError, OptionError
from planner.treat.catalogue_file import products_from_bytes
from planner.treat.option import Option, OptionItem

GENERIC = Path(__file__).resolve().parents[2] / "materials" / "catalogue.csv"
NAN, INF = float("nan"), float("inf")

PLACED = Option(
    name="placed",
    item=[
        OptionItem(product="a", surface="left", count=1, placement=((0.1, 0.2, 0.6, 0.6),)),
        OptionItem(product="a", surface="left", count=1, placement=((0.9, 0.2, 0.6, 0.6),)),
        OptionItem(product="b", surface="floor", area=2.5),
    ],
)


def test_an_untouched_table_is_the_same_option():
    rows = option_rows(PLACED, {}).to_dict("records")
    assert option_of(rows, PLACED) == PLACED


@pytest.mark.parametrize(
    ("pieces", "area", "expected"),
    [(3, NAN, (3, None)), (3.0, None, (3, None)), (NAN, 1.5, (None, 1.5)), (2, 9.0, (2, None))],
)
def test_a_row_becomes_an_item(pieces, area, expected):
    row = {"product": "a", "surface": "left", "pieces": pieces, "area": area}
    (item,) = option_of([row], Option(name="x")).items
    assert (item.count, item.area) == expected


@pytest.mark.parametrize(
    "row",
    [
        {"product": None, "surface": "left", "pieces": 3},
        {"product": "a", "surface": NAN, "pieces": 3},
        {"product": "a", "surface": "left", "pieces": NAN, "area": NAN},
        {"product": "a", "surface": "left", "pieces": 0},
        {},
    ],
)
def test_a_row_that_is_not_finished_counts_for_nothing(row):
    assert option_of([row], Option(name="x")).items == ()


@pytest.mark.parametrize(
    "amount",
    [
        {"pieces": -1},
        {"pieces": 2.5},
        {"pieces": INF},
        {"area": -2.0},
        {"area": INF},
        {"pieces": 1e9},
    ],
)
def test_amounts_that_cannot_be_are_refused(amount):
    with pytest.raises(OptionError):
        option_of([{"product": "a", "surface": "left", **amount}], Option(name="x"))


def test_a_catalogue_comes_back_with_the_same_products():
    raw = GENERIC.read_bytes()
    again = catalogue_text(catalogue_rows(raw), separator(raw)).encode()
    assert cells(catalogue_rows(again)) == cells(catalogue_rows(raw))
    names = [product.id for product in products_from_bytes(raw, file="a")]
    assert [product.id for product in products_from_bytes(again, file="b")] == names


def test_semicolons_and_decimal_commas_survive():
    raw = (
        b"id;unit;width_m;height_m;surfaces;pack;price_per_pack;currency;material\n"
        b"a;piece;0,6;0,6;wall;4;99,50;EUR;wool-50-direct\n"
    )
    assert separator(raw) == ";"
    text = catalogue_text(catalogue_rows(raw), ";")
    (product,) = products_from_bytes(text.encode(), file="a")
    assert product.price_per_pack == 99.5


def test_an_empty_table_is_no_catalogue():
    table = catalogue_rows(b"id,unit\n")
    with pytest.raises(CatalogueError, match="no product"):
        catalogue_text(table)
