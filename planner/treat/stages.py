"""The order of the objectives: least shortfall, then least cost, then the simplest list."""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.treat.problem import Problem
from planner.treat.programme import MOST_SHORT, SLACK, Outcome, Status
from planner.treat.treatment import Axial, Cut, Ease, Treatment, treatment
from planner.treat.windows import Windows

Array = NDArray[np.float64]

SIMPLER_NODES = 500
"""Branches spent on each way of making a list of proven cost simpler."""
SIMPLER_SECONDS = 1.5
"""[s]"""


@dataclass(frozen=True, slots=True)
class Found:
    """The best amounts of one problem."""

    status: Status
    """Of the whole: optimal, infeasible (the target cannot be met) or time-limit."""
    amounts: Array
    """Per choice."""
    gap: float
    """Of the cost, proven. [-]"""
    dropped: tuple[str, ...] = ()
    """Limits that no list can keep and that were left out: ``covers``, ``evenness``."""
    cuts: tuple[Cut, ...] = ()
    """Margins that it was found with."""


class Clock:
    """Seconds left of a budget of time."""

    def __init__(self, seconds: float) -> None:
        self._end = time.monotonic() + seconds

    @property
    def left(self) -> float:
        """[s]."""
        return max(0.0, self._end - time.monotonic())


def cheapest(
    problem: Problem,
    windows: Sequence[Windows],
    judged: NDArray[np.bool_],
    clock: Clock,
    *,
    gap: float = 0.0,
    without: Sequence[frozenset[str]] = (),
    cuts: Sequence[Cut] = (),
    axial: Axial | None = None,
) -> Found | None:
    """The cheapest list inside the target; None where there is none (or none was found in time)."""
    built = treatment(problem, windows, judged, without=without, cuts=cuts, axial=axial)
    outcome = built.programme.solve(built.price, seconds=clock.left, gap=gap)
    if outcome.values is None:
        return None
    return Found(outcome.status, built.amounts_of(outcome), outcome.gap)


def closest(
    problem: Problem, windows: Sequence[Windows], judged: NDArray[np.bool_], clock: Clock
) -> Found:
    """Where the target cannot be met: least shortfall, then least cost.

    Shortfall of a band is the absorption area it lacks, or has too much, over that of the limit.
    First the worst band is made as good as can be, each band counted from the least shortfall that
    is possible in it alone (so that a band which nothing can help does not keep the others from
    being helped); then the sum over the bands; then the cost.
    """
    dropped: tuple[str, ...] = ()
    for ease, names in _attempts(problem):
        built = treatment(problem, windows, judged, soft=True, ease=ease)
        least = _least_possible(built, clock)
        dropped = names
        if least is None:
            continue
        worst = built.programme.unknowns(1, high=MOST_SHORT)
        for band, possible in zip(built.short, least, strict=True):
            built.programme.row((int(band), 1.0), (worst, -1.0), high=_slightly_above(possible))
        outcome = built.programme.solve((worst, 1.0), seconds=clock.left / 3)
        if outcome.status is not Status.INFEASIBLE:
            return _in_order(built, worst, outcome, clock, dropped)
    nothing = np.zeros(len(problem.choices))
    return Found(Status.INFEASIBLE, nothing, 0.0, dropped)


def _least_possible(built: Treatment, clock: Clock) -> list[float] | None:
    """Least shortfall of each band alone; None where the other limits leave no list at all."""
    least = []
    for band in built.short:
        share = clock.left / (2 * len(built.short))
        outcome = built.programme.solve((int(band), 1.0), seconds=share)
        if outcome.status is Status.INFEASIBLE:
            return None
        least.append(outcome.objective if outcome.values is not None else 0.0)
    return least


def _attempts(problem: Problem) -> list[tuple[Ease, tuple[str, ...]]]:
    """Limits that can make even the untreated room impossible are left out one after the other."""
    attempts: list[tuple[Ease, tuple[str, ...]]] = [(Ease(), ())]
    if problem.covers:
        attempts.append((Ease(covers=True), ("covers",)))
    if problem.limits.evenness is not None:
        attempts.append((Ease(evenness=True), ("evenness",)))
    if len(attempts) == 3:
        attempts.append((Ease(covers=True, evenness=True), ("covers", "evenness")))
    return attempts


def _in_order(
    built: Treatment,
    worst: NDArray[np.intp],
    first: Outcome,
    clock: Clock,
    dropped: tuple[str, ...],
) -> Found:
    """Least sum at the least worst band, then least cost at both."""
    programme, best = built.programme, first
    if best.values is None:
        return Found(Status.TIME_LIMIT, np.zeros(len(built.amounts)), float("inf"), dropped)
    timely = best.status is Status.OPTIMAL
    programme.row((worst, 1.0), high=_slightly_above(best.objective))
    outcome = programme.solve((built.short, 1.0), seconds=clock.left / 2)
    if outcome.values is not None:
        best, timely = outcome, timely and outcome.status is Status.OPTIMAL
        programme.row((built.short, 1.0), high=_slightly_above(outcome.objective))
        outcome = programme.solve(built.price, seconds=clock.left)
        if outcome.values is not None:
            best, timely = outcome, timely and outcome.status is Status.OPTIMAL
    gap = best.gap if best is outcome else float("inf")
    amounts = built.amounts_of(best)
    assert best.values is not None
    met = float(np.max(best.values[built.short], initial=0.0)) <= SLACK
    if met and not dropped:
        return Found(best.status, amounts, gap, dropped)
    return Found(Status.INFEASIBLE if timely else Status.TIME_LIMIT, amounts, gap, dropped)


def _slightly_above(value: float) -> float:
    return value + SLACK * max(1.0, abs(value))


def simplest(
    problem: Problem,
    windows: Sequence[Windows],
    judged: NDArray[np.bool_],
    found: Found,
    clock: Clock,
    *,
    cuts: Sequence[Cut] = (),
    axial: Axial | None = None,
) -> Found:
    """Of the lists that cost no more, one with fewer products, then fewer lines.

    Spends a small, fixed effort on each; the list it is given is kept where none simpler turns up.
    """
    if found.status is not Status.OPTIMAL or not np.any(found.amounts > 0):
        return found
    best = found.amounts
    for step in (_fewer_products, _fewer_lines):
        built = treatment(problem, windows, judged, count_products=True, cuts=cuts, axial=axial)
        built.programme.row(built.price, high=_slightly_above(problem.cost(best)))
        outcome = step(built, best, min(SIMPLER_SECONDS, clock.left))
        if outcome.values is None:
            continue
        amounts = built.amounts_of(outcome)
        if _length(problem, amounts) < _length(problem, best) and problem.cost(
            amounts
        ) <= _slightly_above(problem.cost(best)):
            best = amounts
    return replace(found, amounts=best)


def _fewer_products(built: Treatment, best: Array, seconds: float) -> Outcome:
    return built.programme.solve((built.used, 1.0), seconds=seconds, nodes=SIMPLER_NODES)


def _fewer_lines(built: Treatment, best: Array, seconds: float) -> Outcome:
    """With the products of the list at hand and no others."""
    asked, programme = built.problem, built.programme
    kept = np.isin(asked.product_of, asked.product_of[best > 1e-9])
    for number in np.flatnonzero(~kept):
        programme.high[int(built.amounts[number])] = 0.0
    lines = programme.unknowns(int(kept.sum()), high=1.0, whole=True)
    for line, number in zip(lines, np.flatnonzero(kept), strict=True):
        upper = asked.choices[number].upper
        programme.row((built.amounts[number], 1.0), (int(line), -upper), high=0.0)
    return programme.solve((lines, 1.0), seconds=seconds, nodes=SIMPLER_NODES)


def _length(problem: Problem, amounts: Array) -> tuple[int, int]:
    """Different products, lines."""
    used = amounts > 1e-9
    return len(set(problem.product_of[used].tolist())), int(used.sum())
