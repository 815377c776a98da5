"""Treating with confidence: the truth is drawn here, apart from the planner's own draws."""

from __future__ import annotations

import numpy as np
import pytest
from treat_enumeration import time_by
from treat_rooms import BANDS, box, coefficients, panel, target

from planner.air import Air
from planner.errors import OptionError
from planner.predict.prediction import predict
from planner.room.model import TreatmentLimits
from planner.treat.catalogue import Catalogue
from planner.treat.optimise import suggest
from planner.treat.option import treated

AIR = Air()
PRODUCTS = [
    panel("low", [0.7, 0.8, 0.9, 0.8, 0.5, 0.3, 0.2, 0.2], price=45.0),
    panel("high", [0.1, 0.15, 0.4, 0.8, 0.95, 0.95, 0.9, 0.9], price=25.0),
    panel("all", [0.4, 0.6, 0.9, 1.0, 1.0, 1.0, 1.0, 1.0], price=60.0),
]
LOW, HIGH = 0.26, 0.56
AIM = target(LOW, HIGH)


def ask(alpha=0.08, **more):
    return suggest(
        box(alpha=alpha), AIR, AIM, Catalogue(PRODUCTS), TreatmentLimits(keep_clear=("floor",)),
        second_opinion=False, explain=False, **more,
    )  # fmt: skip


def share_of_truths(suggestion, alpha: float, seed: int, count: int = 200) -> float:
    """Share of drawn truths inside the target: own draws, own Eyring, every band."""
    rng = np.random.default_rng(seed)
    room = treated(box(alpha=alpha), suggestion.option, Catalogue(PRODUCTS))
    materials = sorted({part.material for part in room.parts})
    inside = 0
    for _ in range(count):
        error = {name: rng.standard_normal(BANDS) for name in materials}
        truth = np.array(
            [
                a + u * error[p.material]
                for a, u, p in zip(room.alpha, room.u, room.parts, strict=True)
            ]
        )
        area = room.area @ np.clip(truth, 0.0, 0.99)
        times = time_by("eyring", area, room.volume, room.area.sum(), AIR)
        inside += bool(np.all((times >= LOW) & (times <= HIGH)))
    return inside / count


@pytest.mark.parametrize("alpha", [0.05, 0.08, 0.12])
def test_of_two_hundred_truths_as_many_meet_the_target_as_asked(alpha):
    """Confidence 0.9, less the sampling error of 200 draws (1.64 · sqrt(0.9 · 0.1 / 200) = 0.035)."""
    suggestion = ask(alpha, confidence=0.9)
    assert suggestion.status == "optimal"
    assert suggestion.probability >= 0.9 - 0.02
    assert share_of_truths(suggestion, alpha, seed=42) >= 0.9 - 0.035


def test_without_confidence_the_cheapest_list_is_a_gamble():
    """The nominal optimum touches a limit; asking for confidence costs more and buys something."""
    nominal, sure = ask(), ask(confidence=0.9)
    assert nominal.cost < sure.cost
    assert share_of_truths(nominal, 0.08, seed=7) < 0.8


@pytest.mark.slow
def test_confidence_holds_over_many_rooms_and_levels():
    """12 rooms at three levels, 200 truths each; one in twenty may fall under by chance."""
    kept = []
    for seed in range(12):
        alpha = 0.05 + 0.006 * seed
        for confidence in (0.7, 0.8, 0.9):
            suggestion = ask(alpha, confidence=confidence, seed=seed)
            if suggestion.status == "optimal":
                error = 1.64 * np.sqrt(confidence * (1 - confidence) / 200)
                share = share_of_truths(suggestion, alpha, seed=seed)
                kept.append(share >= confidence - error)
    assert len(kept) >= 30
    assert np.mean(kept) >= 0.9


def test_what_no_list_reaches_is_said():
    """A window of two per cent cannot be met with 90 % whatever is bought."""
    suggestion = suggest(
        box(), AIR, target(0.40, 0.41), Catalogue(PRODUCTS), TreatmentLimits(),
        confidence=0.9, second_opinion=False, explain=False,
    )  # fmt: skip
    assert suggestion.status == "infeasible"
    assert suggestion.probability < 0.9
    assert any("90%" in warning or "90 %" in warning for warning in suggestion.warnings)


def test_the_probability_is_the_one_a_prediction_states():
    """`suggest` and `predict` on the same option must not tell two stories."""
    suggestion = ask()
    room = treated(box(), suggestion.option, Catalogue(PRODUCTS))
    assert suggestion.probability == pytest.approx(predict(room, AIR, AIM).probability, abs=0.005)


def test_posterior_draws_take_the_place_of_the_tables():
    """A measurement that has pinned the room down leaves the products' uncertainty only."""
    known = np.full((50, 6, BANDS), 0.08)
    vague = np.clip(np.random.default_rng(1).normal(0.08, 0.06, (50, 6, BANDS)), 0, 1)
    sure = ask(room_draws=known, confidence=0.8)
    assert sure.cost <= ask(room_draws=vague, confidence=0.8).cost
    wrong = ask(room_draws=np.full((50, 6, BANDS), 0.6))
    assert wrong.probability == 0.0


@pytest.mark.parametrize("shape", [(6, BANDS), (10, 5, BANDS), (10, 6, 7), (0, 6, BANDS)])
def test_draws_of_another_room_are_refused(shape):
    with pytest.raises(OptionError, match="do not fit a room of 6 parts"):
        ask(room_draws=np.zeros(shape))


def test_drawn_furnishings_go_with_the_drawn_room():
    """Room and furnishings that trade absorption one for one leave the total known."""
    goods = Catalogue([panel("all", 0.9, price=30.0)])
    rng = np.random.default_rng(2)
    extra = rng.normal(0.0, 2.0, (400, 1, BANDS))
    surface = box().surface_area
    rooms = np.repeat(0.2 - extra / surface, 6, axis=1)
    chairs = 3.0 + extra
    values = coefficients(np.full(BANDS, 3.0), 2.0)
    room = box(alpha=0.2).with_item("chairs", 1, values)
    known = {"second_opinion": False, "explain": False, "room_draws": rooms}
    untreated = target(0.95 * _eyring(room), 1.05 * _eyring(room))
    together = suggest(room, AIR, untreated, goods, item_draws=chairs, **known)
    apart = suggest(room, AIR, untreated, goods, **known)
    assert together.items == ()
    assert together.probability > apart.probability + 0.2
    with pytest.raises(OptionError, match="1 furnishings"):
        suggest(room, AIR, untreated, goods, item_draws=np.ones((400, 3, BANDS)), **known)


def _eyring(room) -> np.ndarray:
    area = room.area @ room.alpha + room.item_count @ room.item_area
    return time_by("eyring", area, room.volume, room.area.sum(), AIR)
