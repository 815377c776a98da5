"""The shopping list: whole packs, sums by hand, cautions, and cells that cannot run."""

from __future__ import annotations

import csv
import io
import json

import pytest
from hypothesis import given
from hypothesis import strategies as st
from treat_rooms import panel

from planner.errors import OptionError
from planner.treat.catalogue import Catalogue
from planner.treat.option import Option, OptionItem
from planner.treat.shopping import harmless, shopping_list, to_csv, to_text

CATALOGUE = Catalogue(
    [
        panel("wool", pack=4, price=100.0, weight_kg=3.0, description="Mineral wool panel"),
        panel("carpet", unit="m2", surfaces=("floor",), pack=2.5, price=40.0, weight_kg=2.0),
        panel("gift", price=None, weight_kg=None),
        panel("made-up", price=9.0, note="invented price"),
        panel("=SUM(A1)", description="@cmd|calc", price=5.0, fire_class_declared="-B"),
    ]
)


def option(*items) -> Option:
    made = []
    for product, surface, number in items:
        key = "area" if isinstance(number, float) else "count"
        made.append(OptionItem(product=product, surface=surface, **{key: number}))
    return Option(name="list", items=tuple(made))


def test_packs_pieces_area_weight_and_cost_by_hand():
    """5 + 4 panels of 0.6 m² in packs of four: 3 packs; 6.1 m² in packs of 2.5: 3 packs."""
    bought = shopping_list(
        option(("wool", "left", 5), ("wool", "ceiling", 4), ("carpet", "floor", 6.1)), CATALOGUE
    )
    wool, carpet = bought.lines
    assert (wool.packs, wool.pieces) == (3, 9)
    assert wool.area_m2 == pytest.approx(5.4)
    assert (wool.weight_kg, wool.cost) == (27.0, 300.0)
    assert wool.spare == 3
    assert wool.spare_percent == pytest.approx(25.0)
    assert (carpet.packs, carpet.pieces) == (3, None)
    assert (carpet.cost, carpet.weight_kg) == (120.0, pytest.approx(12.2))
    assert carpet.spare == pytest.approx(1.4)
    assert bought.total == 420.0
    assert bought.is_complete


def test_a_reserve_for_offcuts_is_bought_on_top():
    """7.0 m² and 10 %: 7.7 m², four packs of 2.5 m² instead of three."""
    plan = option(("carpet", "floor", 7.0))
    assert shopping_list(plan, CATALOGUE).lines[0].packs == 3
    assert shopping_list(plan, CATALOGUE, reserve=0.1).lines[0].packs == 4
    with pytest.raises(OptionError, match="no share"):
        shopping_list(plan, CATALOGUE, reserve=10)


def test_a_missing_price_is_said_and_not_counted_as_nothing():
    bought = shopping_list(option(("gift", "left", 1), ("wool", "left", 1)), CATALOGUE)
    assert bought.total == 100.0
    assert not bought.is_complete
    assert any("no price is known for gift" in warning for warning in bought.warnings)
    assert any("no weight is known for gift" in warning for warning in bought.warnings)
    assert bought.weight_kg is None
    assert shopping_list(option(("gift", "left", 1)), CATALOGUE).total is None
    assert "incomplete" in to_text(bought)
    assert "total, incomplete" in to_csv(bought)


def test_invented_prices_are_said():
    bought = shopping_list(option(("made-up", "left", 1)), CATALOGUE)
    assert any("invented" in warning for warning in bought.warnings)
    assert bought.to_json()["lines"][0]["price_is_invented"]


def test_the_promised_keys():
    data = shopping_list(option(("wool", "left", 2), ("gift", "left", 1)), CATALOGUE).to_json()
    assert data.keys() >= {"lines", "total"}
    for line in data["lines"]:
        assert line.keys() >= {"item", "packs", "pieces", "area_m2", "weight_kg", "cost"}
    json.dumps(data, allow_nan=False)


def test_the_usual_cautions():
    """Fire not verified, fixings, overhead only when something hangs there, dust, exits, codes."""
    on_wall = " ".join(shopping_list(option(("wool", "left", 1)), CATALOGUE).cautions)
    overhead = " ".join(shopping_list(option(("wool", "ceiling", 1)), CATALOGUE).cautions)
    for word in ("not verified", "Fixings", "dust", "escape routes", "Electricity", "Local codes"):
        assert word in on_wall
    assert "Overhead" not in on_wall
    assert "Overhead" in overhead
    assert "none is declared for wool" in on_wall


def test_an_empty_option_costs_nothing():
    bought = shopping_list(Option(name="nothing"), CATALOGUE)
    assert (bought.lines, bought.total, bought.cautions) == ((), 0.0, ())
    to_text(bought)


def test_currencies_are_not_added():
    mixed = Catalogue([panel("a", currency="USD"), panel("b", currency="EUR")])
    with pytest.raises(OptionError, match="prices in EUR, USD"):
        shopping_list(option(("a", "left", 1), ("b", "left", 1)), mixed)
    with pytest.raises(OptionError, match="the room in GBP"):
        shopping_list(option(("a", "left", 1)), mixed, currency="GBP")


def test_an_unknown_product_is_refused():
    with pytest.raises(OptionError, match=r"no product 'wol'.*wool"):
        shopping_list(option(("wol", "left", 1)), CATALOGUE)


def test_cells_that_a_spreadsheet_would_run_are_made_harmless():
    """Common practice: a cell that begins with = + - @ is taken for a formula."""
    text = to_csv(shopping_list(option(("=SUM(A1)", "left", 1)), CATALOGUE))
    rows = list(csv.reader(io.StringIO(text)))
    assert rows[1][0] == "'=SUM(A1)"
    assert rows[1][1] == "'@cmd|calc"
    assert "'-B" in rows[1]
    assert len({len(row) for row in rows}) == 1


@given(st.text(max_size=40))
def test_no_text_stays_dangerous(text):
    """Whatever is typed: no cell begins with a formula sign, also after spaces, none breaks a row."""
    cell = harmless(text)
    assert cell.lstrip()[:1] not in tuple("=+-@")
    assert not set(cell) & set("\r\n\t")
    assert text.replace("\r", " ").replace("\n", " ").replace("\t", " ") in cell
