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
from planner.treat.programme import Status
from planner.treat.stages import Clock, Found, cheapest
from planner.treat.treatment import Cut
from planner.treat.windows import Windows, counted

Array = NDArray[np.float64]
Judge = Callable[[Array], tuple[float, list[tuple[Array, Array]]]]
"""Amounts per choice to the probability that they meet the target and, per window, the mean by
which the drawn absorption area lies above the nominal and its standard deviation. [-], [m²]"""

ROUNDS = 16
"""Solves at most."""
RESERVE = 0.01
"""Asked for on top, so that fresh draws agree as well: their sampling error. [-]"""
KEPT = 8
"""Tangents kept in each window: those at the last lists. More make the programme slow."""
REPEATS = 2
"""Solves with one z to learn σ before a larger one is tried."""
CLOSE = 0.015
"""A probability this little above what is wanted ends the search. [-]"""
SEARCH_GAP = 0.005
"""Relative cost difference that a search for z does not look behind. [-]"""
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
    whole = clock.left
    low, high, z = 0.0, float("inf"), NormalDist().inv_cdf(0.5 + confidence / 2)
    repeats = 0
    for _ in range(ROUNDS):
        cuts = [cut for tangent in tangents for cut in _rows(problem, tangent, z, judged)]
        share = Clock(min(clock.left, 0.2 * whole))
        found = cheapest(problem, windows, judged, share, gap=max(gap, SEARCH_GAP), cuts=cuts)
        if found is None:
            high, likely = z, 1.0
        else:
            found = replace(found, cuts=tuple(cuts))
            likely, unknown = judge(found.amounts)
            likeliest = max(likeliest, (likely, found), key=lambda pair: pair[0])
            more = _tangents(problem, windows, found.amounts, unknown)
            described = _is_described(tangents, more, found.amounts)
            tangents = tangents[-KEPT * len(windows) :] + more
            if likely >= wanted:
                high, reached = z, _cheaper(problem, reached, found)
                if likely < wanted + CLOSE:
                    break
            elif described or repeats == REPEATS:
                low, repeats = z, 0
            else:
                repeats += 1
                continue
        if high - low < 0.05 or clock.left <= 0.0:
            break
        z = _next(z, low, high, likely, wanted)
    if reached is None:
        return replace(likeliest[1], status=Status.INFEASIBLE)
    return _thinned(problem, windows, judged, reached, judge, wanted)


def _thinned(
    problem: Problem,
    windows: Sequence[Windows],
    judged: NDArray[np.bool_],
    found: Found,
    judge: Judge,
    wanted: float,
) -> Found:
    """The list without packs that the draws do not miss, the dearest tried first."""
    if problem.covers or problem.limits.evenness is not None:
        return found  # taking away could break these
    amounts = found.amounts
    for product in np.argsort(-problem.pack_price, kind="stable"):
        while (fewer := _without_a_pack(problem, amounts, int(product))) is not None:
            if not _inside(problem, windows, judged, fewer) or judge(fewer)[0] < wanted:
                break
            amounts = fewer
    return replace(found, amounts=amounts)


def _without_a_pack(problem: Problem, amounts: Array, product: int) -> Array | None:
    """Just so many pieces fewer that a pack less is needed, from the longest lines."""
    packs = problem.packs(amounts)[product]
    if packs < 1:
        return None
    fewer = amounts.copy()
    mine = np.flatnonzero(problem.product_of == product)
    while problem.packs(fewer)[product] >= packs:
        line = mine[int(np.argmax(fewer[mine]))]
        step = min(1.0, fewer[line])
        fewer[line] -= step
    return fewer


def _inside(
    problem: Problem, windows: Sequence[Windows], judged: NDArray[np.bool_], amounts: Array
) -> bool:
    for window in windows:
        area = problem.start(window.formula) + amounts @ problem.effect(window.formula)
        if np.any(judged & ((area < window.low) | (area > window.high))):
            return False
    return True


def _next(z: float, low: float, high: float, likely: float, wanted: float) -> float:
    """The margin that would give the wanted probability if one number ruled it, kept in between."""
    normal = NormalDist()
    step = normal.inv_cdf(0.5 + wanted / 2) - normal.inv_cdf(0.5 + min(likely, 0.999) / 2)
    guess = z + 1.1 * step
    if low < guess < high and likely < 1.0:
        return guess
    return 1.3 * z if np.isinf(high) else 0.5 * (low + high)


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
