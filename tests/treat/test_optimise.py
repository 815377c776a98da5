"""The optimiser against complete enumeration, written out here with its own Sabine and Eyring."""

from __future__ import annotations

import numpy as np
import pytest
from treat_enumeration import (
    air_attenuation,
    brute_force,
    cost_of,
    counts_of,
    draw_instance,
    shortfalls,
    time_by,
    times_of,
)
from treat_rooms import BANDS, box, panel, target

from planner.air import Air
from planner.room.model import TreatmentLimits
from planner.treat.catalogue import Catalogue
from planner.treat.optimise import suggest


def as_grid(instance, suggestion) -> np.ndarray:
    """The suggested list in the terms of the enumeration."""
    counts = {(item.product, item.surface): item.count for item in suggestion.items}
    row = [counts.get((p.id, group[0]), 0) for p, group, _ in instance.slots]
    assert sum(n * len(g) for n, (_, g, _) in zip(row, instance.slots, strict=True)) == sum(
        counts.values()
    )
    return np.array([row], float)


def check(seed: int) -> bool:
    instance = draw_instance(np.random.default_rng(seed))
    suggestion = suggest(
        instance.room, instance.air, target(instance.low, instance.high),
        Catalogue(instance.products), instance.limits, second_opinion=False, explain=False,
    )  # fmt: skip
    feasible, worst, total, cost = brute_force(instance)
    row = as_grid(instance, suggestion)
    short = shortfalls(instance, row)
    assert suggestion.status == ("optimal" if feasible else "infeasible"), seed
    least = shortfalls(instance, counts_of(instance)).min(axis=0)
    assert (short - least).max() == pytest.approx(worst, abs=8e-6), seed
    assert short.sum() == pytest.approx(total, abs=8e-6), seed
    assert suggestion.cost == pytest.approx(cost, abs=1e-6), seed
    assert suggestion.cost == pytest.approx(cost_of(instance, row)[0], abs=1e-6), seed
    assert suggestion.gap == 0.0, seed
    main = instance.formulas[0]
    assert suggestion.predicted == pytest.approx(times_of(instance, row, main)[0], rel=1e-9), seed
    return feasible


def test_equals_enumeration_on_two_hundred_small_rooms():
    """Packs, pairs, area, weight and budget limits, two-sided targets, one and both formulas."""
    feasible = [check(seed) for seed in range(200)]
    assert 60 <= sum(feasible) <= 180, "both kinds of instance must be there in number"


@pytest.mark.slow
def test_equals_enumeration_on_four_hundred_more_rooms():
    """The same on other seeds, so that 600 instances in all are enumerated."""
    feasible = [check(seed) for seed in range(1000, 1400)]
    assert 120 <= sum(feasible) <= 360


def check_with_carpet(seed: int) -> bool:
    """Panels enumerated, and for each number of carpet packs the areas that fit, as an interval."""
    rng = np.random.default_rng(seed)
    room = box(alpha=float(rng.uniform(0.05, 0.15)))
    pack, price = float(rng.choice([1.0, 2.5, 4.0])), float(rng.choice([15.0, 40.0, 70.0]))
    carpet = panel(
        "carpet",
        rng.uniform(0.1, 0.9, BANDS),
        unit="m2",
        surfaces=("floor",),
        pack=pack,
        price=price,
    )
    board = panel("board", rng.uniform(0.3, 1.0, BANDS), price=30.0, surfaces=("ceiling",))
    limits = TreatmentLimits(max_cover={"floor": 0.6, "ceiling": 0.25})
    count, area = rng.integers(0, 8), rng.uniform(0.0, 12.0)
    alpha = {p.on: a for p, a in zip(room.parts, room.alpha, strict=True)}
    bare = room.area @ room.alpha
    gain = 0.6 * (np.minimum(board.coefficients.alpha, 0.99) - alpha["ceiling"])
    slope = np.minimum(carpet.coefficients.alpha, 0.99) - alpha["floor"]
    air = Air()
    times = time_by("eyring", bare + count * gain + area * slope, 50.0, 85.0, air)
    low, high = times * (1 - rng.uniform(0.005, 0.06)), times * (1 + rng.uniform(0.005, 0.06))
    suggestion = suggest(
        room, air, target(low, high), Catalogue([carpet, board]), limits,
        second_opinion=False, explain=False,
    )  # fmt: skip
    c = 343.2 * np.sqrt(293.15 / 293.15)
    needed = [
        24 * np.log(10) * 50.0 / (c * t) - 4 * air_attenuation(air) * 50.0 for t in (high, low)
    ]
    least, most = (85.0 * (1 - np.exp(-n / 85.0)) for n in needed)
    best = np.inf
    for boards in range(int(0.25 * 20.0 / 0.6) + 1):
        reached = bare + boards * gain
        ends = np.sort([(least - reached) / slope, (most - reached) / slope], axis=0)
        first, last = max(0.0, ends[0].max()), min(12.0, ends[1].min())
        if first <= last + 1e-9:
            best = min(best, 30.0 * boards + price * np.ceil(first / pack - 1e-9))
    assert suggestion.status == "optimal", seed
    assert suggestion.cost == pytest.approx(best, abs=1e-6), seed
    return any(item.count is None for item in suggestion.items)


def test_goods_by_the_square_metre_equal_enumeration():
    """150 rooms with a carpet of any area and panels; the carpet is used in many of them."""
    assert sum(check_with_carpet(seed) for seed in range(150)) > 50
