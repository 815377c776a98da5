"""The optimiser against complete enumeration, written out here with its own Sabine and Eyring."""

from __future__ import annotations

import numpy as np
import pytest
from treat_enumeration import (
    brute_force,
    cost_of,
    counts_of,
    draw_instance,
    shortfalls,
    times_of,
)
from treat_rooms import target

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
