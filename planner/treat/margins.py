"""Treating with confidence: margins on the absorption area, iterated until the draws agree.

In each band the absorption area must keep a margin of z standard deviations σ from both ends of its
window. σ grows with the amounts of each product, since all its pieces are off by the same; as a
root of a sum of squares it is convex, so that its tangents at the lists seen so far are rows of
the programme. A list is judged by draws, never by the normal law: z only steers, and is searched
for the least that reaches the confidence.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from planner.treat.catalogue import Product
from planner.treat.problem import Problem
from planner.treat.programme import Cut, Status
from planner.treat.stages import Clock, Found, cheapest
from planner.treat.windows import Windows, counted

Array = NDArray[np.float64]
Judge = Callable[[Array], tuple[float, list[tuple[Array, Array]]]]
"""Amounts per choice to the probability that they meet the target and, per window, the mean by
which the drawn absorption area lies above the nominal and its standard deviation. [-], [m²]"""

ROUNDS = 16
"""Solves at most."""
RESERVE = 0.01
"""Asked for on top, so that fresh draws agree as well: their sampling error. [-]"""
NEAR = 0.03
"""Tangents that miss σ by less than this share describe it well enough. [-]"""


@dataclass(frozen=True, slots=True)
class _Tangent:
    """σ about one list, in one window."""

    window: Windows
    sigma: Array
    """At the list, shape ``(band,)``. [m²]"""
    slope: Array
    """Per unit of each choice, shape ``(choice, band)``. [m²]"""
    shift: Array
    """Mean above nominal, shape ``(band,)``. [m²]"""
    amounts: Array

    def at(self, amounts: Array) -> Array:
        """σ by this tangent at another list, shape ``(band,)``. [m²]."""
        value: Array = self.sigma + (amounts - self.amounts) @ self.slope
        return value


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
    """The cheapest list found that the draws say meets the target with that probability.

    Parameters
    ----------
    problem, windows, judged
        As for `planner.treat.stages.cheapest`.
    nominal
        The cheapest list for the nominal coefficients.
    judge
        The draws.
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
    tangents = _tangents(problem, windows, nominal.amounts, unknown)
    low, high, z = 0.0, float("inf"), NormalDist().inv_cdf(0.5 + confidence / 2)
    for _ in range(ROUNDS):
        cuts = [cut for tangent in tangents for cut in _rows(problem, tangent, z, judged)]
        found = cheapest(problem, windows, judged, clock, gap=gap, cuts=cuts)
        if found is None:
            high = z
        else:
            likely, unknown = judge(found.amounts)
            likeliest = max(likeliest, (likely, found), key=lambda pair: pair[0])
            more = _tangents(problem, windows, found.amounts, unknown)
            described = _is_described(tangents, more, found.amounts)
            tangents += more
            if likely >= wanted:
                high, reached = z, _cheaper(problem, reached, found)
            elif described:
                low = z
            else:
                continue
        z = z * 1.5 if np.isinf(high) else 0.5 * (low + high)
        if high - low < 0.03 or clock.left <= 0.0:
            break
    return reached or replace(likeliest[1], status=Status.INFEASIBLE)


def _tangents(
    problem: Problem,
    windows: Sequence[Windows],
    amounts: Array,
    unknown: list[tuple[Array, Array]],
) -> list[_Tangent]:
    """Tangents to σ at a list, one per window."""
    faces = problem.copies * [choice.product.piece_area or 1.0 for choice in problem.choices]
    area = np.zeros(len(problem.products))
    np.add.at(area, problem.product_of, faces * amounts)
    found = []
    for window, (shift, sigma) in zip(windows, unknown, strict=True):
        spread = np.array([_spread(product, window.formula) for product in problem.products])
        spread = spread.reshape(len(problem.products), -1)
        of_products = (spread * area[:, None]) ** 2
        rest = np.maximum(sigma**2 - of_products.sum(axis=0), 0.0)
        total = np.sqrt(rest + of_products.sum(axis=0)) + 1e-12
        steep = spread**2 * area[:, None] / total
        slope = steep[problem.product_of] * faces[:, None]
        found.append(_Tangent(window, total, slope, shift, amounts))
    return found


def _spread(product: Product, formula: str) -> Array:
    """Standard deviation of a product's coefficients as a formula counts them, ``(band,)``. [-]."""
    values = product.coefficients
    if product.unit == "item":
        return np.asarray(values.u, float)
    normals = NormalDist()
    steps = np.array([normals.inv_cdf((n + 0.5) / 200) for n in range(200)])[:, None]
    drawn = np.clip(values.alpha + steps * values.u, 0.0, np.maximum(1.3, values.alpha))
    result: Array = counted(drawn, formula).std(axis=0)
    return result


def _rows(problem: Problem, tangent: _Tangent, z: float, judged: NDArray[np.bool_]) -> list[Cut]:
    """Area ∓ z σ inside the window, with σ by the tangent."""
    window = tangent.window
    start, effect = problem.start(window.formula), problem.effect(window.formula)
    rows = []
    fixed = tangent.sigma - tangent.amounts @ tangent.slope
    for band in np.flatnonzero(judged):
        middle = start[band] + tangent.shift[band]
        for limit, sign in ((window.low[band], 1.0), (window.high[band], -1.0)):
            if np.isfinite(limit):
                scale = sign / max(abs(limit), 0.1)
                weights = scale * effect[:, band] - abs(scale) * z * tangent.slope[:, band]
                rows.append(Cut(weights, scale * (limit - middle) + abs(scale) * z * fixed[band]))
    return rows


def _is_described(known: Sequence[_Tangent], new: Sequence[_Tangent], amounts: Array) -> bool:
    """Did the tangents that a list was found with already know its σ."""
    for tangent in new:
        seen = [old.at(amounts) for old in known if old.window is tangent.window]
        if np.any(tangent.sigma > np.max(seen, axis=0) * (1 + NEAR)):
            return False
    return True


def _cheaper(problem: Problem, one: Found | None, other: Found) -> Found:
    if one is None or problem.cost(other.amounts) < problem.cost(one.amounts):
        return other
    return one
