"""Treating with confidence: windows narrowed until the draws agree.

The windows on the absorption area are narrowed by z standard deviations of what the list at hand
leaves unknown, the programme is solved again, and its list judged by draws; z is searched for the
least that reaches the confidence. Draws judge, not the normal law: z only steers.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from planner.treat.problem import Problem
from planner.treat.programme import Status
from planner.treat.stages import Clock, Found, cheapest
from planner.treat.windows import Windows

Array = NDArray[np.float64]
Judge = Callable[[Array], tuple[float, list[tuple[Array, Array]]]]

ROUNDS = 9
"""Solves at most."""
RESERVE = 0.006
"""Asked for on top, so that fresh draws agree as well: their sampling error at 4000. [-]"""


def robustly(
    problem: Problem,
    windows: Sequence[Windows],
    judged: NDArray[np.bool_],
    nominal: Found,
    judge: Judge,
    *,
    confidence: float,
    clock: Clock,
    gap: float,
) -> Found:
    """The cheapest list that the draws say meets the target with that probability.

    Parameters
    ----------
    problem, windows, judged
        As for `planner.treat.stages.cheapest`.
    nominal
        The cheapest list for the nominal coefficients.
    judge
        Amounts per choice to the probability that they meet the target, and for each window the
        mean by which the drawn absorption area lies above the nominal one and its standard
        deviation. [-], [m²]
    confidence
        Wanted. [-]
    clock, gap
        Time left; of each solve.

    Returns
    -------
    found
        Its status is infeasible where no list reached the confidence; it is then the likeliest seen.
    """
    wanted = min(confidence + RESERVE, 0.995)
    likely, unknown = judge(nominal.amounts)
    if likely >= wanted:
        return nominal
    likeliest: tuple[float, Found] = (likely, nominal)
    reached: Found | None = None
    low, high, z = 0.0, float("inf"), NormalDist().inv_cdf(0.5 + confidence / 2)
    for _ in range(ROUNDS):
        if clock.left <= 0.0:
            break
        narrowed = [
            window.narrowed(z * sigma - shift, z * sigma + shift)
            for window, (shift, sigma) in zip(windows, unknown, strict=True)
        ]
        found = cheapest(problem, narrowed, judged, clock, gap=gap)
        if found is None:
            high = z
        else:
            likely, unknown = judge(found.amounts)
            likeliest = max(likeliest, (likely, found), key=lambda pair: pair[0])
            if likely >= wanted:
                high, reached = z, _cheaper(problem, reached, found)
            else:
                low = z
        z = z * 1.6 if np.isinf(high) else 0.5 * (low + high)
        if high - low < 0.03:
            break
    return reached or replace(likeliest[1], status=Status.INFEASIBLE)


def _cheaper(problem: Problem, one: Found | None, other: Found) -> Found:
    if one is None or problem.cost(other.amounts) < problem.cost(one.amounts):
        return other
    return one
