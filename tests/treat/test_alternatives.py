"""The cost-against-deviation front and the second-best lists, against enumeration."""

from __future__ import annotations

import numpy as np
import pytest
from treat_enumeration import cost_of, counts_of, draw_instance, pieces_of, times_of
from treat_rooms import box, panel, target

from planner.air import Air
from planner.room.model import TreatmentLimits
from planner.treat.alternatives import front, second_best
from planner.treat.catalogue import Catalogue
from planner.treat.optimise import suggest
from planner.treat.task import task_for


def asked(seed: int, wider: float = 0.0):
    instance = draw_instance(np.random.default_rng(seed))
    instance.low, instance.high = instance.low * (1 - wider), instance.high * (1 + wider)
    task = task_for(
        instance.room, instance.air, target(instance.low, instance.high),
        Catalogue(instance.products), instance.limits,
    )  # fmt: skip
    return instance, task


def deviations(instance, grid) -> np.ndarray:
    """Farthest that any band lies outside, in seconds, worst formula."""
    worst = np.zeros(len(grid))
    for formula in instance.formulas:
        times = times_of(instance, grid, formula)
        over = np.fmax(times - instance.high, instance.low - times)
        worst = np.maximum(worst, np.nan_to_num(over, nan=0.0).max(axis=1))
    return np.where(worst < 1e-5, 0.0, worst)


def test_no_enumerated_list_is_both_cheaper_and_nearer():
    """On 40 small rooms every point of the front, first one apart where infeasible, is undominated."""
    points = 0
    for seed in range(300, 340):
        instance, task = asked(seed)
        grid = counts_of(instance)
        cost, deviation = cost_of(instance, grid), deviations(instance, grid)
        found = front(task, points=6)
        assert found[-1].cost == 0.0
        for point in found[1:] if found[0].deviation_s > 0 else found:
            better = (cost < point.cost * (1 - 0.0101) - 1e-6) & (
                deviation <= point.deviation_s + 1e-6
            )
            assert not better.any(), (seed, point.cost, cost[better].min())
            points += 1
    assert points > 60


def test_the_front_falls_from_dear_and_near_to_cheap_and_far():
    _, task = asked(311)
    found = front(task)
    assert [p.cost for p in found] == sorted((p.cost for p in found), reverse=True)
    assert [p.deviation_s for p in found] == sorted(p.deviation_s for p in found)
    assert len({p.suggestion.option.name for p in found}) == len(found)


def test_second_best_lists_are_made_of_other_products_and_are_the_cheapest_such():
    """Enumerated: the cheapest list inside the target that lacks a product of the first."""
    compared = 0
    for seed in range(400, 460):
        instance, task = asked(seed, wider=0.3)
        grid = counts_of(instance)
        first = suggest(
            instance.room, instance.air, task.target, task.catalogue, instance.limits,
            second_opinion=False, explain=False,
        )  # fmt: skip
        if not first.meets_target or not first.items:
            continue
        used = [k for k, p in enumerate(instance.products) if p.id in first.option.products]
        other = (pieces_of(instance, grid)[:, used] == 0).any(axis=1)
        fine = other & (deviations(instance, grid) == 0)
        found = second_best(task, first, count=1)
        assert bool(found) == bool(fine.any()), seed
        if found:
            assert found[0].cost == pytest.approx(cost_of(instance, grid[fine]).min(), rel=2e-4)
            assert found[0].option.name != first.option.name
            compared += 1
    assert compared >= 10


def test_each_second_best_lacks_a_product_of_all_before_it():
    products = [panel(name, 0.9, price=30.0 + n) for n, name in enumerate("abcd")]
    task = task_for(box(), Air(), target(0.3, 0.5), Catalogue(products), TreatmentLimits())
    first = suggest(
        box(), Air(), target(0.3, 0.5), Catalogue(products), second_opinion=False, explain=False
    )
    lists = [first, *second_best(task, first, count=3)]
    sets = [set(entry.option.products) for entry in lists]
    assert len(sets) == 4
    for later in range(1, 4):
        assert all(not sets[earlier] <= sets[later] for earlier in range(later))
    assert [entry.cost for entry in lists] == sorted(entry.cost for entry in lists)
