"""The programme behind a suggestion.

Unknowns are the amounts of each `Choice` (whole pieces, or square metres) and the packs of each
product; a symmetric pair is one unknown. The reverberation-time limits are rows on the absorption
area (`planner.treat.windows`), scaled by the limit so that all rows are of order one.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.treat.covers import absorbs_reflections, pieces_to_cover
from planner.treat.problem import EVEN_BANDS, Problem
from planner.treat.programme import MOST_SHORT, Outcome, Programme
from planner.treat.windows import Windows

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Ease:
    """How far named limits may be given up, for finding what would help."""

    budget: bool = False
    area: tuple[str, ...] = ()
    """Surfaces whose area limit may be passed."""
    weight: tuple[str, ...] = ()
    products: bool = False
    evenness: bool = False
    covers: bool = False


@dataclass(frozen=True, slots=True)
class Cut:
    """A further row: weights · amounts ≥ least."""

    weights: Array
    """Shape ``(choice,)``."""
    least: float


@dataclass(frozen=True, slots=True)
class Axial:
    """A limit on a sum over the axes of concave functions of their mean coefficients.

    Each function lies under its tangents, which are the rows; what lies between the tangents is
    left to cuts.
    """

    start: Array
    """Mean coefficient of each axis, shape ``(3, band)``. [-]"""
    slope: Array
    """Per unit of each choice, shape ``(choice, 3, band)``. [-]"""
    knots: Array
    """Coefficients where the tangents touch, shape ``(knot,)``. [-]"""
    value: Array
    """Of the function there, shape ``(knot, 3, band)``."""
    steepness: Array
    """Of the function there, shape ``(knot, 3, band)``."""
    least: Array
    """The sum must reach that, shape ``(band,)``; −inf where it need not."""


@dataclass(slots=True)
class Treatment:
    """The programme of one problem with the numbers of its unknowns."""

    problem: Problem
    programme: Programme
    amounts: NDArray[np.intp]
    """Per choice."""
    packs: NDArray[np.intp]
    """Per product."""
    short: NDArray[np.intp]
    """Relative shortfall per judged band where it is allowed, else empty."""
    bands: NDArray[np.intp]
    """Judged bands, positions in `OCTAVES`."""
    eased: NDArray[np.intp]
    """How far each eased limit is passed, in its own unit."""
    used: NDArray[np.intp]
    """1 where a product is used; empty unless asked for."""

    @property
    def price(self) -> tuple[NDArray[np.intp], Array]:
        """The cost as an objective."""
        return self.packs, self.problem.pack_price

    def amounts_of(self, outcome: Outcome) -> Array:
        """Amounts per choice, whole where pieces are whole. [piece] or [m²]."""
        assert outcome.values is not None
        values = np.clip(outcome.values[self.amounts], 0.0, None)
        continuous = np.array([choice.is_continuous for choice in self.problem.choices], bool)
        return np.where(continuous, np.where(values < 1e-9, 0.0, values), np.rint(values))


def treatment(
    problem: Problem,
    windows: Sequence[Windows],
    judged: NDArray[np.bool_],
    *,
    soft: bool = False,
    ease: Ease = Ease(),
    count_products: bool = False,
    without: Sequence[frozenset[str]] = (),
    cuts: Sequence[Cut] = (),
    axial: Axial | None = None,
) -> Treatment:
    """Build the programme of a problem.

    Parameters
    ----------
    problem
        Choices and limits.
    windows
        Limits on the absorption area, one entry per formula that must meet the target.
    judged
        Bands that decide, shape ``(band,)``.
    soft
        Allow each band to fall short, by an unknown of its own.
    ease
        Limits that may be passed, each by an unknown of its own.
    count_products
        Add the unknowns that say which product is used.
    without
        Sets of products of which at least one must be missing.
    cuts
        Further rows.
    axial
        A limit on the three axes together.
    """
    programme = Programme()
    choices = problem.choices
    upper = np.array([choice.upper for choice in choices])
    whole = np.array([not choice.is_continuous for choice in choices], bool)
    if ease.area or ease.weight:
        upper = _eased_upper(problem, ease, upper)
    amounts = programme.unknowns(len(choices), high=upper, whole=whole)
    packs = programme.unknowns(len(problem.products), high=_most_packs(problem, upper), whole=True)
    bands = np.flatnonzero(judged)
    short = programme.unknowns(len(bands), high=MOST_SHORT) if soft else np.zeros(0, np.intp)
    eased: list[int] = []
    for number, product in enumerate(problem.products):
        mine = problem.product_of == number
        programme.row(
            (amounts[mine], problem.copies[mine]), (packs[number], -product.pack), high=0.0
        )
    _band_rows(programme, problem, windows, amounts, bands, short)
    _cap_rows(programme, problem, amounts, ease, eased)
    _budget_row(programme, problem, packs, ease, eased)
    _evenness_rows(programme, problem, amounts, ease)
    for cut in cuts:
        programme.row((amounts, cut.weights), low=cut.least)
    if axial is not None:
        _axial_rows(programme, amounts, axial)
    if not ease.covers:
        _cover_rows(programme, problem, amounts)
    limit = problem.limits.max_products
    used = np.zeros(0, np.intp)
    if count_products or without or limit is not None:
        used = _used_products(programme, problem, amounts, upper)
        _product_rows(programme, problem, used, limit, without, ease, eased)
    return Treatment(
        problem, programme, amounts, packs, short, bands, np.array(eased, np.intp), used
    )


def _most_packs(problem: Problem, upper: Array) -> Array:
    """Packs that the largest amounts would take: every unknown is bounded."""
    most = np.zeros(len(problem.products))
    np.add.at(most, problem.product_of, problem.copies * upper)
    packs: Array = np.ceil(most / [product.pack for product in problem.products]) + 1.0
    return packs


def _eased_upper(problem: Problem, ease: Ease, upper: Array) -> Array:
    """Largest amounts once some caps are given up: what fits is still an end."""
    freed = {*ease.area, *ease.weight}
    found = [
        choice.fits if freed & set(choice.on) else most
        for choice, most in zip(problem.choices, upper, strict=True)
    ]
    return np.array(found, float)


def _band_rows(
    programme: Programme,
    problem: Problem,
    windows: Sequence[Windows],
    amounts: NDArray[np.intp],
    bands: NDArray[np.intp],
    short: NDArray[np.intp],
) -> None:
    for window in windows:
        start, effect = problem.start(window.formula), problem.effect(window.formula)
        for position, band in enumerate(bands):
            for limit, is_low in ((window.low[band], True), (window.high[band], False)):
                if not np.isfinite(limit):
                    continue
                scale = max(abs(limit), 0.1)
                terms = [(amounts, effect[:, band] / scale)]
                if len(short):
                    terms.append((short[position : position + 1], 1.0 if is_low else -1.0))
                rest = (limit - start[band]) / scale
                programme.row(*terms, **{"low" if is_low else "high": rest})


def _cap_rows(
    programme: Programme,
    problem: Problem,
    amounts: NDArray[np.intp],
    ease: Ease,
    eased: list[int],
) -> None:
    for cap in problem.caps:
        terms: list[tuple[NDArray[np.intp], Array | float]] = [(amounts, cap.weights)]
        passed = ease.area if cap.kind == "area" else ease.weight
        if cap.surface in passed:
            extra = programme.unknowns(1, high=max(0.0, cap.possible - cap.most))
            eased.append(int(extra[0]))
            terms.append((extra, -1.0))
        programme.row(*terms, high=cap.most)


def _budget_row(
    programme: Programme, problem: Problem, packs: NDArray[np.intp], ease: Ease, eased: list[int]
) -> None:
    budget = problem.limits.budget
    if budget is None or not problem.is_priced:
        return
    terms: list[tuple[NDArray[np.intp], Array | float]] = [(packs, problem.pack_price)]
    if ease.budget:
        extra = programme.unknowns(1)
        eased.append(int(extra[0]))
        terms.append((extra, -1.0))
    programme.row(*terms, high=budget)


def _evenness_rows(
    programme: Programme, problem: Problem, amounts: NDArray[np.intp], ease: Ease
) -> None:
    """A_i / S_i ≤ ratio · A_j / S_j for each two axes, mean of 500 Hz to 4 kHz."""
    ratio = problem.limits.evenness
    if ratio is None or ease.evenness:
        return
    size, start, effect = problem.axis_areas("sabine")
    there = np.flatnonzero(size > 0)
    mean = start[:, EVEN_BANDS].mean(axis=1) / np.where(size > 0, size, 1.0)
    slope = effect[:, :, EVEN_BANDS].mean(axis=2) / np.where(size > 0, size, 1.0)
    for one in there:
        for other in there:
            if one != other:
                programme.row(
                    (amounts, slope[:, one] - ratio * slope[:, other]),
                    high=float(ratio * mean[other] - mean[one]),
                )


def _axial_rows(programme: Programme, amounts: NDArray[np.intp], axial: Axial) -> None:
    for band in np.flatnonzero(np.isfinite(axial.least)):
        parts = programme.unknowns(3, low=-100.0, high=100.0)
        programme.row((parts, 1.0), low=float(axial.least[band]))
        for axis, part in enumerate(parts):
            for knot, value, steep in zip(
                axial.knots,
                axial.value[:, axis, band],
                axial.steepness[:, axis, band],
                strict=True,
            ):
                programme.row(
                    (int(part), 1.0),
                    (amounts, -steep * axial.slope[:, axis, band]),
                    high=float(value + steep * (axial.start[axis, band] - knot)),
                )


def _cover_rows(programme: Programme, problem: Problem, amounts: NDArray[np.intp]) -> None:
    """Each rectangle is covered by one product; its pieces serve no other rectangle."""
    served: dict[tuple[str, int], list[tuple[int, float]]] = {}
    for cover in problem.covers:
        able = [
            number
            for number, choice in enumerate(problem.choices)
            if cover.surface in choice.on and absorbs_reflections(choice.product)
        ]
        by = programme.unknowns(len(able), high=1.0, whole=True)
        programme.row((by, 1.0), low=1.0)
        for unknown, number in zip(by, able, strict=True):
            needed = pieces_to_cover(problem.choices[number].product, cover)
            served.setdefault((cover.surface, number), []).append((int(unknown), needed))
    for (_, number), uses in served.items():
        unknowns = np.array([unknown for unknown, _ in uses], np.intp)
        needs = np.array([needed for _, needed in uses])
        programme.row((amounts[number : number + 1], -1.0), (unknowns, needs), high=0.0)


def _used_products(
    programme: Programme, problem: Problem, amounts: NDArray[np.intp], upper: Array
) -> NDArray[np.intp]:
    """Amount ≤ upper · used."""
    used = programme.unknowns(len(problem.products), high=1.0, whole=True)
    for number, product in enumerate(problem.product_of):
        programme.row((amounts[number], 1.0), (used[product], -upper[number]), high=0.0)
    return used


def _product_rows(
    programme: Programme,
    problem: Problem,
    used: NDArray[np.intp],
    limit: int | None,
    without: Sequence[frozenset[str]],
    ease: Ease,
    eased: list[int],
) -> None:
    if limit is not None:
        terms: list[tuple[NDArray[np.intp], Array | float]] = [(used, 1.0)]
        if ease.products:
            extra = programme.unknowns(1, whole=True)
            eased.append(int(extra[0]))
            terms.append((extra, -1.0))
        programme.row(*terms, high=float(limit))
    ids = [product.id for product in problem.products]
    for taken in without:
        numbers = [number for number, name in enumerate(ids) if name in taken]
        if numbers:
            programme.row((used[numbers], 1.0), high=len(numbers) - 1.0)
