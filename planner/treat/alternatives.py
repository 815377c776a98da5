"""Other lists to compare: what a smaller budget buys, and what does as well with other products."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.treat.describing import describe
from planner.treat.programme import Status
from planner.treat.stages import Clock, Found, cheapest, closest
from planner.treat.suggestion import Suggestion
from planner.treat.task import Task
from planner.treat.windows import Windows, windows

Array = NDArray[np.float64]

FRONT_GAP = 0.01
"""Points between the ends are this near to the least cost. [-]"""


@dataclass(frozen=True, slots=True)
class FrontPoint:
    """The cheapest list that stays within a deviation from the target."""

    deviation_s: float
    """Farthest that a judged band lies outside its limits. [s]"""
    cost: float
    """Of whole packs. [currency], or [m²] where nothing has a price"""
    suggestion: Suggestion


def front(task: Task, *, points: int = 8, time_limit: float = 10.0) -> tuple[FrontPoint, ...]:
    """The cost-against-deviation front: no list is both cheaper and nearer the target.

    The deviation is held below a few steps between the least possible and that of the untreated
    room, and the cost is minimised at each (ε-constraint).

    Parameters
    ----------
    task
        From `planner.treat.optimise.task_for`.
    points
        Steps, 2 or more.
    time_limit
        For all solves together. [s]

    Returns
    -------
    front
        From the nearest and dearest to the cheapest, each different from the last.
    """
    clock = Clock(time_limit)
    first = cheapest(task.problem, task.windows, task.judged, Clock(clock.left / 2))
    if first is None:
        first = closest(task.problem, task.windows, task.judged, Clock(clock.left / 2))
    nearest = _point(task, first)
    nothing = _point(task, Found(Status.OPTIMAL, np.zeros(len(task.problem.choices)), 0.0))
    found = [nearest]
    steps = np.linspace(nearest.deviation_s, nothing.deviation_s, max(points, 2))[1:-1]
    for step in steps:
        if clock.left <= 0.0 or found[-1].cost <= 0.0:
            break
        share = Clock(min(max(clock.left / 3, 0.2), 1.5))
        answer = cheapest(
            task.problem, widened(task, float(step)), task.judged, share, gap=FRONT_GAP
        )
        if answer is not None:
            found.append(_point(task, answer))
    found.append(nothing)
    return _undominated(found)


def widened(task: Task, by: float) -> tuple[Windows, ...]:
    """The windows when each limit may be passed by so many seconds."""
    low = np.asarray(task.target.low, float) - by
    return windows(
        task.surfaces,
        task.air,
        np.where(low > 0, low, np.nan),
        np.asarray(task.target.high, float) + by,
        task.names,
    )


def _point(task: Task, found: Found) -> FrontPoint:
    suggestion = describe(task, found)
    deviation = suggestion.deviation_s
    named = replace(
        suggestion,
        option=suggestion.option.model_copy(
            update={
                "name": f"{task.name}, inside the target"
                if deviation == 0
                else f"{task.name}, {deviation:.2f} s outside"
            }
        ),
    )
    return FrontPoint(deviation, suggestion.cost, named)


def _undominated(points: list[FrontPoint]) -> tuple[FrontPoint, ...]:
    kept: list[FrontPoint] = []
    for point in sorted(points, key=lambda p: (p.deviation_s, p.cost)):
        if not kept or point.cost < kept[-1].cost - 1e-9:
            kept.append(point)
    return tuple(kept)


def second_best(
    task: Task, first: Suggestion, *, count: int = 3, time_limit: float = 10.0
) -> tuple[Suggestion, ...]:
    """The next cheapest lists made of other products, not with one panel moved.

    Each leaves out at least one product of every list before it.

    Parameters
    ----------
    task
        From `planner.treat.optimise.task_for`.
    first
        The suggestion they are alternatives to.
    count
        How many at most.
    time_limit
        For all solves together. [s]

    Returns
    -------
    alternatives
        Inside the target where the first is; empty where nothing else does it.
    """
    clock = Clock(time_limit)
    taken = [frozenset(first.option.products)]
    found: list[Suggestion] = []
    limits = task.windows if first.meets_target else widened(task, first.deviation_s * 1.001)
    while taken[-1] and len(found) < count and clock.left > 0.0:
        share = Clock(clock.left / (count - len(found)))
        answer = cheapest(task.problem, limits, task.judged, share, gap=1e-4, without=taken)
        if answer is None:
            break
        left_out = ", ".join(sorted(taken[-1] - _products(task, answer)))
        named = replace(task, name=f"{task.name}, without {left_out}"[:200])
        found.append(describe(named, answer))
        taken.append(frozenset(found[-1].option.products))
    return tuple(found)


def _products(task: Task, found: Found) -> set[str]:
    return {
        choice.product.id
        for choice, amount in zip(task.problem.choices, found.amounts, strict=True)
        if amount > 0
    }
