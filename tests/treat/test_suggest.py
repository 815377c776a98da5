"""What a suggestion respects, and what it says when the target is out of reach."""

from __future__ import annotations

import ctypes
import json
import math

import numpy as np
import pytest
from treat_rooms import BANDS, box, panel, target

from planner.air import Air
from planner.errors import CatalogueError, OptionError
from planner.room.model import TreatmentLimits
from planner.treat.catalogue import Catalogue
from planner.treat.covers import Cover, merged, pieces_to_cover
from planner.treat.optimise import suggest
from planner.treat.option import treated

PROMISED = {"status", "items", "cost", "predicted", "probability", "gap", "short_bands"}
AIR = Air()
FAR = target(0.35, 0.45)
"""The untreated box of these tests has about 1 s."""


def ask(products, limits=None, aim=FAR, room=None, **more):
    more = {"second_opinion": False, "explain": False} | more
    return suggest(
        room or box(), AIR, aim, Catalogue(products), TreatmentLimits(**(limits or {})), **more
    )


def area_on(suggestion, surface):
    return sum(item.area_m2 for item in suggestion.items if item.surface == surface)


def test_the_promised_keys_and_only_finite_numbers():
    """JSON without NaN, with the keys that are promised to users."""
    data = ask([panel()], explain=True, second_opinion=True).to_json()
    assert data.keys() >= PROMISED
    assert data["items"][0].keys() >= {"product", "surface", "count", "area_m2"}
    json.dumps(data, allow_nan=False)


def test_a_room_inside_its_target_needs_nothing():
    suggestion = ask([panel()], aim=target(0.1, 5.0))
    assert (suggestion.status, suggestion.items, suggestion.cost) == ("optimal", (), 0.0)


def test_an_over_damped_room_is_not_treated_further():
    """Panels only absorb: a room that is too short already is said to be so, for no money."""
    suggestion = ask([panel()], aim=target(2.0, 3.0))
    assert suggestion.status == "infeasible"
    assert suggestion.cost == 0.0
    assert {band.side for band in suggestion.short_bands} == {"too short"}
    assert all(band.missing_m2 < 0 for band in suggestion.short_bands)


def test_whole_packs_are_paid():
    """Cost is that of the packs, not of the pieces."""
    suggestion = ask([panel(pack=6, price=90.0)])
    pieces = sum(item.count for item in suggestion.items)
    assert suggestion.cost == pytest.approx(90.0 * math.ceil(pieces / 6))


def test_least_area_where_nothing_has_a_price():
    """Without prices the thicker panel wins because it takes less surface."""
    strong, weak = panel("strong", 0.95, price=None), panel("weak", 0.5, price=None)
    suggestion = ask([weak, strong])
    assert suggestion.option.products == ("strong",)
    assert suggestion.currency == "m2"
    assert suggestion.cost == pytest.approx(sum(item.area_m2 for item in suggestion.items))


def test_products_without_a_price_are_left_out_and_named():
    suggestion = ask([panel("priced"), panel("gift", price=None)])
    assert suggestion.option.products == ("priced",)
    assert any("gift" in warning for warning in suggestion.warnings)


def test_another_currency_is_refused():
    with pytest.raises(CatalogueError, match="priced in USD, the room in EUR"):
        ask([panel(currency="USD")])


def test_an_empty_currency_is_the_rooms():
    assert ask([panel(currency="")], {"currency": "GBP"}).currency == "GBP"


def test_symmetric_walls_get_the_same():
    suggestion = ask([panel(surfaces=("wall",))], {"symmetric": (("left", "right"),)})
    counts = {item.surface: item.count for item in suggestion.items}
    assert counts["left"] == counts["right"] > 0


def test_cover_area_weight_and_placement_limits_hold():
    limits = {
        "max_cover": {"ceiling": 0.3},
        "max_weight_kg": {"left": 20.0},
        "keep_clear": ("floor", "back"),
    }
    suggestion = ask(
        [panel()], limits, area_limits={"front": 2.5}, piece_limits={("right", "panel"): 3}
    )
    assert suggestion.status == "optimal"
    assert area_on(suggestion, "ceiling") <= 0.3 * 20.0 + 1e-9
    assert area_on(suggestion, "front") <= 2.5
    assert area_on(suggestion, "back") == 0
    assert area_on(suggestion, "right") <= 3 * 0.6 + 1e-9
    assert area_on(suggestion, "left") <= 5 * 0.6 + 1e-9  # 20 kg carry five panels of 4 kg


def test_thin_deep_and_screwed_products_are_left_out_where_asked():
    products = [
        panel("thin", thickness_mm=20.0, price=1.0),
        panel("deep", thickness_mm=100.0, gap_mm=300.0, price=2.0),
        panel("right", thickness_mm=100.0, price=40.0),
    ]
    limits = {"min_thickness_mm": 50.0, "max_depth_mm": 200.0}
    assert ask(products, limits).option.products == ("right",)
    stand = panel("stand", 4.0, unit="item", surfaces=("free",), mounting="free-standing")
    assert ask([*products, stand], {"rented": True}).option.products == ("stand",)


def test_no_more_different_products_than_allowed():
    """Two products each good in half of the bands: one alone cannot do it."""
    low = panel("low", [0.9] * 4 + [0.1] * 4, price=20.0)
    high = panel("high", [0.1] * 4 + [0.9] * 4, price=20.0)
    both = panel("both", 0.9, price=200.0)
    assert set(ask([low, high, both]).option.products) == {"low", "high"}
    assert ask([low, high, both], {"max_products": 1}).option.products == ("both",)


def test_evenness_keeps_the_axes_alike():
    """Mean coefficients of floor+ceiling, front+back, left+right, 500 Hz to 4 kHz, by hand."""
    product = panel(surfaces=("wall", "ceiling"))
    suggestion = ask([product], {"evenness": 1.5, "keep_clear": ("floor",)})
    room = treated(box(), suggestion.option, Catalogue([product]))
    means = []
    for pair in (("floor", "ceiling"), ("front", "back"), ("left", "right")):
        rows = [k for k, part in enumerate(room.parts) if part.on in pair]
        means.append(room.area[rows] @ room.alpha[rows, 3:7].mean(axis=1) / room.area[rows].sum())
    assert suggestion.status == "optimal"
    assert max(means) <= 1.5 * min(means) + 1e-6


def test_continuous_goods_by_the_square_metre():
    """A carpet of just the area that is needed, bought in whole packs."""
    carpet = panel("carpet", 0.6, unit="m2", surfaces=("floor",), pack=2.0, price=30.0)
    suggestion = ask([carpet], aim=target(0.60, 0.75))
    (item,) = suggestion.items
    assert item.count is None
    assert suggestion.cost == pytest.approx(30.0 * math.ceil(item.area_m2 / 2.0 - 1e-6))
    assert 0 < item.area_m2 <= 20.0


def test_free_standing_things_hide_nothing_and_keep_to_a_tenth_of_the_floor():
    """1.2 m wide and 0.5 m deep on 20 m²: three at most."""
    stand = panel(
        "stand", 0.5, unit="item", surfaces=("free",), thickness_mm=500.0, width=1.2, price=1.0
    )
    suggestion = ask([stand])
    (item,) = suggestion.items
    assert (item.surface, item.count, item.area_m2) == ("free", 3, 0.0)


def test_first_reflections_are_covered_by_enough_pieces_of_one_product():
    """A dearer absorbing panel is taken where the cheap one absorbs no reflection."""
    cheap = panel("cheap", [0.9] * 4 + [0.2] * 4, price=5.0)
    good = panel("good", 0.9, price=60.0)
    spot = Cover("left", 1.0, 0.9, 1.4, 0.6)
    suggestion = ask([cheap, good], covers=[spot])
    on_left = [i for i in suggestion.items if i.surface == "left" and i.product == "good"]
    assert sum(item.count for item in on_left) >= 2  # 1.4 m need two panels of 1.0 x 0.6 m


def test_what_cannot_be_covered_is_said_and_left_out():
    suggestion = ask(
        [panel()], {"keep_clear": ("left",)}, covers=[Cover("left", 1.0, 0.9, 0.6, 0.6)]
    )
    assert suggestion.status == "infeasible"
    assert any("first reflections cannot be covered" in warning for warning in suggestion.warnings)


def test_pieces_to_cover_turns_a_panel_when_that_saves_one():
    """0.9 x 1.1 m: upright panels of 0.6 x 1.2 m need two, lying ones too; 1.1 x 0.6 needs one."""
    product = panel(width=1.2, height=0.6)
    assert pieces_to_cover(product, Cover("left", 0, 0, 0.9, 1.1)) == 2
    assert pieces_to_cover(product, Cover("left", 0, 0, 0.6, 1.1)) == 1


def test_overlapping_rectangles_are_one():
    one, other = Cover("left", 0, 0, 1, 1), Cover("left", 0.5, 0.5, 1, 1)
    assert merged([one, other]) == [Cover("left", 0, 0, 1.5, 1.5)]
    assert merged([one, Cover("right", 0, 0, 1, 1)]) == [one, Cover("right", 0, 0, 1, 1)]


def test_out_of_budget_names_the_missing_money_and_square_metres():
    """The advice is true: with that much more money the same call succeeds, with less it does not."""
    free = ask([panel()])
    short = ask([panel()], {"budget": free.cost / 2}, explain=True)
    assert short.status == "infeasible"
    assert short.cost <= free.cost / 2
    assert "budget" in short.binding
    (advice,) = [r for r in short.relaxations if r.limit == "budget"]
    assert advice.amount == pytest.approx(free.cost / 2)
    assert ask([panel()], {"budget": free.cost}).status == "optimal"
    assert ask([panel()], {"budget": free.cost - 1}).status == "infeasible"
    band = short.short_bands[0]
    assert band.missing_m2 > band.largest_possible_m2 > 0
    assert band.reached_s > band.limit_s


def test_too_little_surface_names_the_square_metres_more():
    """The advice on area is true as well: one panel less than advised fails."""
    limits = {
        "keep_clear": ("floor", "front", "back", "left", "right"),
        "max_cover": {"ceiling": 0.2},
    }
    aim = target(0.3, 0.6)
    short = ask([panel()], limits, aim, explain=True)
    assert short.status == "infeasible"
    (advice,) = [r for r in short.relaxations if r.limit == "area"]
    assert advice.where == "ceiling"
    assert "m² more on the ceiling" in advice.says
    wider = limits | {"max_cover": {"ceiling": (4.0 + advice.amount + 1e-6) / 20.0}}
    assert ask([panel()], wider, aim).status == "optimal"
    tighter = limits | {"max_cover": {"ceiling": (4.0 + advice.amount - 0.61) / 20.0}}
    assert ask([panel()], tighter, aim).status == "infeasible"
    assert any(r.limit == "keep_clear" for r in short.relaxations)


def test_the_bass_that_no_product_reaches_is_said_first():
    """125 Hz: what is missing, and the most that could be had, which is less."""
    thin = panel("thin", [0.02, 0.12, 0.2, 0.6, 0.9, 0.9, 0.9, 0.9])
    high = np.full(BANDS, np.nan)
    high[1], high[4] = 0.4, 0.6
    short = ask([thin], aim=target(np.nan, high), explain=True)
    assert short.status == "infeasible"
    assert [band.band_hz for band in short.short_bands] == [125]
    assert short.items, "the hopeless band must not keep the others from being treated"
    assert short.short_bands[0].missing_m2 > 5 > short.short_bands[0].largest_possible_m2
    (only,) = short.relaxations
    assert only.limit == "target"
    assert f"{short.short_bands[0].reached_s:.2f} s at 125 Hz" in only.says


def test_assumed_bands_are_shown_but_do_not_decide():
    """A limit at 63 Hz, where the room's coefficients are assumed, neither binds nor condemns."""
    room = box()
    room.assumed[:, 0] = True
    high = np.full(BANDS, 0.5)
    high[0] = 0.05
    suggestion = ask([panel()], aim=target(np.nan, high), room=room)
    assert suggestion.status == "optimal"
    assert 63 not in suggestion.judged_hz
    assert any("63 Hz" in warning for warning in suggestion.warnings)
    asked = ask([panel()], aim=target(np.nan, high), room=room, include_assumed=True)
    assert asked.status == "infeasible"


def test_unknown_surfaces_and_confidences_are_refused():
    with pytest.raises(OptionError, match="no surface 'roof'"):
        ask([panel()], {"max_cover": {"roof": 0.5}})
    with pytest.raises(OptionError, match="no surface 'roof'"):
        ask([panel()], covers=[Cover("roof", 0, 0, 1, 1)])
    with pytest.raises(OptionError, match="confidence of 2"):
        ask([panel()], confidence=2.0)


def test_a_closed_surface_is_opened_as_far_as_needed():
    """Cover limits of nothing leave no panel to choose; the advice is still given and true."""
    surfaces = ("floor", "ceiling", "front", "back", "left", "right")
    limits = {"max_cover": dict.fromkeys(surfaces, 0.0)}
    short = ask([panel()], limits, explain=True)
    advice = next(r for r in short.relaxations if r.limit == "area" and r.where == "ceiling")
    opened = {"max_cover": limits["max_cover"] | {"ceiling": (advice.amount + 1e-6) / 20.0}}
    assert ask([panel()], opened).status == "optimal"


def test_advice_keeps_to_what_the_placement_found_room_for():
    """More than fits round doors and windows must not be advised."""
    limits = {"max_cover": {"ceiling": 0.1}, "keep_clear": ("floor", "front", "back", "left")}
    short = ask([panel()], limits, area_limits={"ceiling": 3.0, "right": 0.0}, explain=True)
    assert short.status == "infeasible"
    assert not [r for r in short.relaxations if r.limit == "area"]


def test_nothing_but_the_answer_reaches_standard_output(capfd):
    """Lines that compiled code prints by itself do not get into ``--json``."""
    from planner.treat.programme import silenced_stdout

    libc = ctypes.CDLL(None)
    with silenced_stdout():
        libc.puts(b"chatter")
    print("answer", flush=True)
    libc.fflush(None)
    assert capfd.readouterr().out == "answer\n"


def test_no_time_still_answers():
    """A clock that has run out gives an honest status, not a crash."""
    suggestion = ask([panel(f"p{n}", 0.5 + 0.02 * n, price=10.0 + n) for n in range(20)],
                     aim=target(0.399, 0.401), time_limit=0.0)  # fmt: skip
    assert suggestion.status in ("optimal", "infeasible", "time-limit")
    json.dumps(suggestion.to_json(), allow_nan=False)


def test_same_input_same_list():
    products = [panel("a", 0.8, price=30.0), panel("b", 0.7, price=25.0)]
    assert ask(products).to_json() == ask(products).to_json()


def test_a_list_that_rests_on_exact_coefficients_says_so():
    """The cheapest list lies just inside; half of all rooms like it would not (two-sided: fewer)."""
    plain = ask([panel()])
    assert plain.status == "optimal"
    assert plain.probability < 0.5
    assert f"probability of {plain.probability:.0%} only" in " ".join(plain.warnings)
    assert "only: measure" not in " ".join(ask([panel()], confidence=0.6).warnings)
