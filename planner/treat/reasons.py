"""Why a target cannot be met, and what would make it possible."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.predict.targets import TargetLimits
from planner.treat.catalogue import Catalogue
from planner.treat.choosing import problem
from planner.treat.problem import Problem
from planner.treat.programme import Status
from planner.treat.stages import Clock, cheapest
from planner.treat.suggestion import Relaxation, ShortBand
from planner.treat.treatment import Ease, treatment
from planner.treat.windows import Windows

Array = NDArray[np.float64]

SECONDS_EACH = 2.0
"""For one question of the kind "what if". [s]"""


def short_bands(
    asked: Problem,
    windows: Sequence[Windows],
    judged: NDArray[np.bool_],
    amounts: Array,
    methods: Mapping[str, Array],
    target: TargetLimits,
) -> tuple[ShortBand, ...]:
    """Judged bands outside the target, each with what is missing and the most that could be had.

    By the first formula that must meet the target and misses it in that band.
    """
    found: list[ShortBand] = []
    seen: set[int] = set()
    for window in windows:
        start, effect = asked.start(window.formula), asked.effect(window.formula)
        reached = start + amounts @ effect
        times = methods[window.formula]
        for band in np.flatnonzero(judged):
            too_long = times[band] > target.high[band] * (1 + 1e-5)
            too_short = times[band] < target.low[band] * (1 - 1e-5)
            if not (too_long or too_short) or band in seen:
                continue
            seen.add(int(band))
            limit = float(window.low[band] if too_long else window.high[band])
            found.append(
                ShortBand(
                    band_hz=OCTAVES[band],
                    side="too long" if too_long else "too short",
                    missing_m2=limit - float(start[band]),
                    largest_possible_m2=_extreme(asked, effect[:, band], largest=bool(too_long)),
                    short_by_m2=limit - float(reached[band]),
                    reached_s=float(times[band]),
                    limit_s=float(target.high[band] if too_long else target.low[band]),
                )
            )
    return tuple(sorted(found, key=lambda band: band.band_hz))


def _extreme(asked: Problem, effect: Array, *, largest: bool) -> float:
    """Most (or least) absorption area that can be added in one band under all other limits. [m²]."""
    nowhere = np.zeros(len(OCTAVES), bool)
    built = treatment(asked, (), nowhere)
    sign = -1.0 if largest else 1.0
    outcome = built.programme.solve((built.amounts, sign * effect), seconds=SECONDS_EACH, gap=1e-4)
    if outcome.values is None:
        return 0.0
    return float(built.amounts_of(outcome) @ effect)


def binding_limits(asked: Problem, amounts: Array) -> tuple[str, ...]:
    """Limits that leave no room for one more of the smallest thing they hold."""
    if not np.any(amounts > 0):
        return ()
    said = []
    limits = asked.limits
    for cap in asked.caps:
        smallest = float(np.min(cap.weights[cap.weights > 0]))
        if cap.most - float(cap.weights @ amounts) < smallest * (1 - 1e-9):
            said.append(f"{cap.kind} on the {cap.surface}".replace(" on the free", ""))
    if limits.budget is not None and asked.is_priced:
        left = limits.budget - asked.cost(amounts)
        if left < float(np.min(asked.pack_price, initial=np.inf)):
            said.append("budget")
    if limits.max_products is not None:
        used = len(set(asked.product_of[amounts > 0].tolist()))
        if used >= limits.max_products:
            said.append("number of different products")
    return tuple(said)


def relaxations(
    asked: Problem,
    windows: Sequence[Windows],
    judged: NDArray[np.bool_],
    catalogue: Catalogue,
    clock: Clock,
    short: Sequence[ShortBand],
) -> tuple[Relaxation, ...]:
    """Every single limit that, given up, lets the target be met, and how far it must be given up.

    Numbers are least amounts, proven where time allowed; the one with the cheapest list comes
    first. Where no single limit helps, budget and all areas are given up together. Last comes what
    the target itself would have to allow for the list at hand, whose short bands are `short`.
    """
    found = [
        *_by_amount(asked, windows, judged, clock),
        *_whole(asked, windows, judged, catalogue, clock),
    ]
    if not found:
        found = _together(asked, windows, judged, clock)
    found.sort(key=lambda one: np.inf if one.cost is None else one.cost)
    return (*found, *_target(short))


def _target(short: Sequence[ShortBand]) -> list[Relaxation]:
    """The times that the closest list reaches, as limits."""
    if not short:
        return []
    says = "accept " + ", ".join(f"{band.reached_s:.2f} s at {band.band_hz} Hz" for band in short)
    farthest = max(abs(band.reached_s - band.limit_s) for band in short)
    where = ", ".join(str(band.band_hz) for band in short)
    return [Relaxation("target", where, farthest, "s", says)]


def _by_amount(
    asked: Problem, windows: Sequence[Windows], judged: NDArray[np.bool_], clock: Clock
) -> list[Relaxation]:
    found = []
    for kind, where, ease in _candidates(asked):
        built = treatment(asked, windows, judged, ease=ease)
        outcome = built.programme.solve(
            (built.eased, 1.0), seconds=min(SECONDS_EACH, clock.left), gap=1e-3
        )
        if outcome.values is None:
            continue
        amount = float(outcome.values[built.eased].sum())
        if amount > 1e-6:
            cost = asked.cost(built.amounts_of(outcome))
            found.append(_said(asked, kind, where, amount, cost))
    return found


def _candidates(asked: Problem) -> list[tuple[str, str, Ease]]:
    limits = asked.limits
    found: list[tuple[str, str, Ease]] = []
    if limits.budget is not None and asked.is_priced:
        found.append(("budget", "", Ease(budget=True)))
    for cap in asked.caps:
        if cap.kind == "area" and cap.most < cap.possible - 1e-6:
            found.append(("area", cap.surface, Ease(area=(cap.surface,))))
        if cap.kind == "weight":
            found.append(("weight", cap.surface, Ease(weight=(cap.surface,))))
    if limits.max_products is not None:
        found.append(("products", "", Ease(products=True)))
    return found


def _said(asked: Problem, kind: str, where: str, amount: float, cost: float) -> Relaxation:
    money = cost if asked.is_priced else None
    if kind == "budget":
        rounded = float(np.ceil(amount - 1e-6))
        says = f"raise the budget by {rounded:.0f} {asked.currency}"
        return Relaxation(kind, where, amount, asked.currency, says, money)
    if kind == "area":
        says = f"allow {np.ceil(amount * 10 - 1e-6) / 10:.1f} m² more on the {where}"
        return Relaxation(kind, where, amount, "m²", says, money)
    if kind == "weight":
        says = f"let the {where} carry {np.ceil(amount):.0f} kg more"
        return Relaxation(kind, where, amount, "kg", says, money)
    number = round(amount)
    says = f"allow {number} more different product{'s' if number > 1 else ''}"
    return Relaxation(kind, where, float(number), "", says, money)


def _whole(
    asked: Problem,
    windows: Sequence[Windows],
    judged: NDArray[np.bool_],
    catalogue: Catalogue,
    clock: Clock,
) -> list[Relaxation]:
    """Limits that are kept or not: nothing in between."""
    found = []
    for kind, where, changes, says in _switches(asked):
        limits = asked.limits.model_copy(update=changes)
        given = {cap.surface: cap.most for cap in asked.caps if cap.kind == "area"}
        covers = () if kind == "covers" else asked.covers
        freed = problem(asked.surfaces, catalogue, limits, area_limits=given, covers=covers)
        answer = cheapest(freed, windows, judged, Clock(min(SECONDS_EACH, clock.left)), gap=1e-3)
        if answer is not None:
            cost = freed.cost(answer.amounts) if freed.is_priced else None
            found.append(Relaxation(kind, where, None, "", says, cost))
    return found


def _switches(asked: Problem) -> list[tuple[str, str, dict[str, object], str]]:
    limits = asked.limits
    found: list[tuple[str, str, dict[str, object], str]] = []
    for name in limits.keep_clear:
        rest = tuple(other for other in limits.keep_clear if other != name)
        found.append(
            ("keep_clear", name, {"keep_clear": rest}, f"allow treatment on the {name} as well")
        )
    if limits.symmetric:
        found.append(("symmetric", "", {"symmetric": ()}, "give up the symmetry of the walls"))
    if limits.max_depth_mm is not None:
        found.append(("depth", "", {"max_depth_mm": None}, "allow deeper build-ups"))
    if limits.min_thickness_mm is not None:
        found.append(("thickness", "", {"min_thickness_mm": None}, "allow thinner build-ups"))
    if limits.rented:
        found.append(("rented", "", {"rented": False}, "allow screws in walls and ceiling"))
    if asked.covers:
        found.append(("covers", "", {}, "leave the first reflections uncovered"))
    if limits.evenness is not None:
        found.append(("evenness", "", {"evenness": None}, "give up the evenness of the axes"))
    return found


def _together(
    asked: Problem, windows: Sequence[Windows], judged: NDArray[np.bool_], clock: Clock
) -> list[Relaxation]:
    """Budget and all areas given up at once, each counted by its share of what is allowed."""
    candidates = [c for c in _candidates(asked) if c[0] in ("budget", "area")]
    if len(candidates) < 2:
        return []
    areas = tuple(where for kind, where, _ in candidates if kind == "area")
    budget = any(kind == "budget" for kind, _, _ in candidates)
    built = treatment(asked, windows, judged, ease=Ease(budget=budget, area=areas))
    # The eased unknowns come in the order of the rows: areas in the order of the caps, then budget.
    order = [c for c in candidates if c[0] == "area"] + [c for c in candidates if c[0] == "budget"]
    scale = [
        max(asked.limits.budget or 1.0, 1.0)
        if kind == "budget"
        else max(asked.surfaces.area_on(where, "base"), 0.1)
        for kind, where, _ in order
    ]
    outcome = built.programme.solve(
        (built.eased, 1.0 / np.array(scale)), seconds=min(SECONDS_EACH, clock.left), gap=1e-3
    )
    if outcome.values is None or outcome.status is Status.INFEASIBLE:
        return []
    cost = asked.cost(built.amounts_of(outcome))
    parts = [
        _said(asked, kind, where, float(amount), cost)
        for (kind, where, _), amount in zip(order, outcome.values[built.eased], strict=True)
        if amount > 1e-6
    ]
    says = " and ".join(part.says for part in parts)
    return [Relaxation("together", "", None, "", says, cost if asked.is_priced else None)]
