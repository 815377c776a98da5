"""The cheapest set of panels that meets the target: the way from a room to a `Suggestion`."""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.air import Air
from planner.bands import OCTAVES
from planner.errors import OptionError
from planner.predict.prediction import DRAWS, predict
from planner.predict.targets import TargetLimits
from planner.room.model import TreatmentLimits
from planner.room.surfaces import RoomSurfaces
from planner.treat.catalogue import Catalogue
from planner.treat.margins import robustly
from planner.treat.option import Option, item_area, treated
from planner.treat.problem import Cover, Problem, problem
from planner.treat.programme import Status
from planner.treat.reasons import binding_limits, relaxations, short_bands
from planner.treat.robust import STEERING_DRAWS, area_spread, meets, time_draws
from planner.treat.stages import Clock, Found, cheapest, closest, simplest
from planner.treat.suggestion import SecondOpinion, SuggestedItem, Suggestion
from planner.treat.windows import Windows, absorption_area, formulas, judged_bands, windows

Array = NDArray[np.float64]

TOLERANCE = 1e-5
"""Relative excess over a limit that counts as rounding. [-]"""


@dataclass(frozen=True, slots=True)
class Task:
    """One room to be treated: what `suggest` was asked."""

    surfaces: RoomSurfaces
    air: Air
    target: TargetLimits
    catalogue: Catalogue
    limits: TreatmentLimits
    problem: Problem
    judged: NDArray[np.bool_]
    windows: tuple[Windows, ...]
    room_draws: Array | None
    confidence: float | None
    name: str
    seed: int

    @property
    def names(self) -> tuple[str, ...]:
        """Formulas that must meet the target."""
        return formulas(self.limits.formula)


def suggest(
    surfaces: RoomSurfaces,
    air: Air,
    target: TargetLimits,
    catalogue: Catalogue,
    limits: TreatmentLimits | None = None,
    *,
    area_limits: Mapping[str, float] | None = None,
    piece_limits: Mapping[tuple[str, str], float] | None = None,
    covers: Sequence[Cover] = (),
    confidence: float | None = None,
    room_draws: Array | None = None,
    include_assumed: bool = False,
    second_opinion: bool = True,
    simulation: Callable[[RoomSurfaces], Array] | None = None,
    time_limit: float = 10.0,
    gap: float = 0.0,
    explain: bool = True,
    name: str = "suggested",
    seed: int = 1,
) -> Suggestion:
    """The cheapest treatment inside the target, proven; or the closest, and what stands in the way.

    Objectives in order: least shortfall, then least cost of whole packs (least area where nothing
    has a price), then the simplest list. The rounded answer is checked with the predictor.

    Parameters
    ----------
    surfaces
        The room as it is, or as calibrated by a measurement.
    air, target
        State of the air; limits on the reverberation time.
    catalogue
        Products to choose from.
    limits
        The room file's ``[treatment]``; no limits by default.
    area_limits
        Most that can be mounted on a surface, by name, from the placement. [m²]
    piece_limits
        Most pieces of a product on a surface, by ``(surface, product)``, from the placement.
    covers
        Rectangles that must be covered, such as first reflections.
    confidence
        Probability with which the target is to be met under the uncertainty of the coefficients,
        0.5 to 0.99; None for the nominal coefficients. [-]
    room_draws
        Posterior draws of the coefficients of `surfaces`, shape ``(draw, part, band)``; drawn from
        their uncertainty by default. [-]
    include_assumed
        Let bands decide in which coefficients of the room are assumed. By default those are
        predicted and shown but neither constrain the list nor the verdict.
    second_opinion
        Run the list through the directional formulas as well (rectangular rooms).
    simulation
        Another predictor asked in the same way: room to reverberation time ``(band,)``. [s]
    time_limit
        For the solver, all stages together. [s]
    gap
        Relative cost difference below which the search may stop. [-]
    explain
        Work out what would make an impossible target possible (costs up to `time_limit` again).
    name
        Of the option.
    seed
        Of all draws.

    Returns
    -------
    suggestion
        `Suggestion.to_json` has the promised keys.

    Raises
    ------
    CatalogueError
        Prices in another currency than the room's.
    OptionError
        A limit, a rectangle or a set of draws that does not fit the room.
    """
    began = time.monotonic()
    task = task_for(
        surfaces,
        air,
        target,
        catalogue,
        limits,
        area_limits=area_limits,
        piece_limits=piece_limits,
        covers=covers,
        confidence=confidence,
        room_draws=room_draws,
        include_assumed=include_assumed,
        name=name,
        seed=seed,
    )
    clock = Clock(time_limit)
    found = solve(task, clock, gap)
    answer = describe(task, found)
    if explain and answer.status == Status.INFEASIBLE:
        more = relaxations(task.problem, task.windows, task.judged, catalogue, Clock(time_limit))
        answer = replace(answer, relaxations=more)
    if second_opinion or simulation is not None:
        from planner.treat.beyond import ask_others

        opinion = ask_others(
            task, answer, found.amounts, second_opinion, simulation, Clock(time_limit), gap
        )
        answer = _agreed(answer, opinion)
    return replace(answer, seconds=time.monotonic() - began)


def _agreed(answer: Suggestion, opinion: SecondOpinion | None) -> Suggestion:
    """The answer with the second opinion; a list on which all agree takes its place at no cost."""
    corrected = opinion.corrected if opinion is not None else None
    if opinion is None or corrected is None or corrected.cost > answer.cost + 1e-9:
        return replace(answer, second_opinion=opinion)
    if answer.confidence is not None and corrected.probability < answer.confidence:
        return replace(answer, second_opinion=opinion)
    others = corrected.second_opinion
    assert others is not None
    return replace(
        corrected,
        option=corrected.option.model_copy(update={"name": answer.option.name}),
        gap=answer.gap,
        status=answer.status,
        second_opinion=others,
    )


def task_for(
    surfaces: RoomSurfaces,
    air: Air,
    target: TargetLimits,
    catalogue: Catalogue,
    limits: TreatmentLimits | None = None,
    *,
    area_limits: Mapping[str, float] | None = None,
    piece_limits: Mapping[tuple[str, str], float] | None = None,
    covers: Sequence[Cover] = (),
    confidence: float | None = None,
    room_draws: Array | None = None,
    include_assumed: bool = False,
    name: str = "suggested",
    seed: int = 1,
) -> Task:
    """What is asked, checked and turned into arrays; arguments as for `suggest`.

    Raises
    ------
    CatalogueError, OptionError
        As `suggest`.
    """
    if confidence is not None and not 0.5 <= confidence <= 0.99:
        raise OptionError(
            f"a confidence of {confidence:g} cannot be asked for",
            cure="Write a probability from 0.5 to 0.99, for example 0.9.",
        )
    limits = limits or TreatmentLimits()
    return Task(
        surfaces=surfaces,
        air=air,
        target=target,
        catalogue=catalogue,
        limits=limits,
        problem=problem(
            surfaces,
            catalogue,
            limits,
            area_limits=area_limits,
            piece_limits=piece_limits,
            covers=covers,
        ),
        judged=judged_bands(target, surfaces, include_assumed=include_assumed),
        windows=windows(surfaces, air, target.low, target.high, formulas(limits.formula)),
        room_draws=room_draws,
        confidence=confidence,
        name=name,
        seed=seed,
    )


def solve(task: Task, clock: Clock, gap: float = 0.0) -> Found:
    """Best amounts for a task: inside the target where that is possible, with confidence if asked."""
    found = best(task.problem, task.windows, task.judged, clock, gap)
    if task.confidence is None or found.status is Status.INFEASIBLE:
        return found
    return robustly(
        task.problem,
        task.windows,
        task.judged,
        found,
        lambda amounts: _judged_by_draws(task, amounts),
        confidence=task.confidence,
        clock=clock,
        gap=gap,
    )


def _judged_by_draws(task: Task, amounts: Array) -> tuple[float, list[tuple[Array, Array]]]:
    """Probability of meeting the target, and what is not known of the absorption area. [-], [m²]."""
    room = treated(task.surfaces, task.problem.option(amounts, task.name), task.catalogue)
    times = time_draws(
        room,
        task.air,
        task.names,
        count=STEERING_DRAWS,
        seed=task.seed + 1000,
        room_draws=task.room_draws,
    )
    inside = meets(times, task.target, task.judged)
    spread = area_spread(room, task.air, times)
    unknown = [
        (spread[name][0] - absorption_area(room, name), spread[name][1]) for name in task.names
    ]
    return float(np.mean(inside.all(axis=1))), unknown


def best(
    asked: Problem,
    limits: Sequence[Windows],
    judged: NDArray[np.bool_],
    clock: Clock,
    gap: float = 0.0,
) -> Found:
    """Cheapest list inside the windows and the simplest of those, or the closest there is."""
    found = cheapest(asked, limits, judged, clock, gap=gap)
    if found is None:
        return closest(asked, limits, judged, clock)
    return simplest(asked, limits, judged, found, clock)


def describe(task: Task, found: Found) -> Suggestion:
    """The amounts found as a suggestion, checked with the predictor."""
    option = task.problem.option(found.amounts, task.name)
    room = treated(task.surfaces, option, task.catalogue)
    methods = times_by(task, room, ("sabine", "eyring"))
    main = task.names[0]
    untreated = times_by(task, task.surfaces, (main,))[main]
    deviation = max(outside_by(methods[name], task.target, task.judged) for name in task.names)
    times = time_draws(
        room, task.air, task.names, count=DRAWS, seed=task.seed, room_draws=task.room_draws
    )
    inside = meets(times, task.target, task.judged)
    status = found.status
    if deviation > 0 and status is Status.OPTIMAL:
        status = Status.INFEASIBLE
    return Suggestion(
        status=status.value,
        option=option,
        items=_items(option, task.catalogue),
        cost=task.problem.cost(found.amounts),
        currency=task.problem.currency if task.problem.is_priced else "m2",
        predicted=methods[main],
        methods=methods,
        untreated=untreated,
        target_low=np.asarray(task.target.low, float),
        target_high=np.asarray(task.target.high, float),
        judged_hz=_hz(task.judged),
        assumed_hz=room.assumed_hz,
        probability=float(np.mean(inside.all(axis=1))),
        band_probability=inside.mean(axis=0),
        confidence=task.confidence,
        gap=found.gap,
        deviation_s=deviation,
        short_bands=short_bands(
            task.problem, task.windows, task.judged, found.amounts, methods, task.target
        )
        if deviation > 0
        else (),
        binding=binding_limits(task.problem, found.amounts),
        warnings=_warnings(task, found, room),
    )


def times_by(task: Task, room: RoomSurfaces, names: Sequence[str]) -> dict[str, Array]:
    """Reverberation times of a room by the predictor's formulas, ``(band,)`` each. [s]."""
    methods = predict(room, task.air, task.target, methods=names, draws=0).methods
    return {name: methods[name] for name in names}


def outside_by(times: Array, target: TargetLimits, judged: NDArray[np.bool_]) -> float:
    """Farthest that a judged band lies outside its limits, 0 where all are inside. [s]."""
    low = np.where(judged & np.isfinite(target.low), target.low, 0.0)
    high = np.where(judged & np.isfinite(target.high), target.high, np.inf)
    over = np.where(times > high * (1 + TOLERANCE), times - high, 0.0)
    under = np.where(times < low * (1 - TOLERANCE), low - times, 0.0)
    return float(np.max(np.maximum(over, under)))


def _items(option: Option, catalogue: Catalogue) -> tuple[SuggestedItem, ...]:
    return tuple(
        SuggestedItem(
            item.product,
            catalogue.find(item.product).description,
            item.surface,
            item.count,
            item_area(item, catalogue.find(item.product)),
        )
        for item in option.items
    )


def _hz(bands: NDArray[np.bool_]) -> tuple[int, ...]:
    return tuple(hz for hz, flag in zip(OCTAVES, bands, strict=True) if flag)


def _warnings(task: Task, found: Found, room: RoomSurfaces) -> tuple[str, ...]:
    said = list(task.problem.warnings)
    limited = np.isfinite(task.target.low) | np.isfinite(task.target.high)
    unjudged = _hz(limited & ~task.judged)
    if unjudged:
        said.append(
            f"{', '.join(str(hz) for hz in unjudged)} Hz: coefficients are assumed there, so the "
            "band is predicted but does not decide"
        )
    if not task.judged.any():
        said.append("no band can be judged: nothing was asked of the treatment")
    products = sorted(
        {
            hz
            for hz in _hz(task.judged)
            if hz in room.assumed_hz and hz not in task.surfaces.assumed_hz
        }
    )
    if products:
        said.append(
            f"{', '.join(str(hz) for hz in products)} Hz: a chosen product's coefficient is assumed"
        )
    said += [_DROPPED[name] for name in found.dropped]
    said += _confidence_warning(task, found)
    if found.status is Status.TIME_LIMIT:
        said.append(
            "the time was up before this was proven the cheapest"
            if np.isfinite(found.gap)
            else "the time was up before a list inside the target was found or ruled out"
        )
    if any(product.price_is_invented for product in task.problem.products):
        said.append("prices are invented: put your own into a catalogue")
    return tuple(said)


_DROPPED = {
    "covers": "the first reflections cannot be covered within the other limits",
    "evenness": "the axes cannot be made as even as asked within the other limits",
}


def _confidence_warning(task: Task, found: Found) -> list[str]:
    if task.confidence is None:
        return []
    if found.status is not Status.INFEASIBLE:
        return [
            "the cheapest list for margins that reach the confidence asked for: its gap is proven for "
            "those margins"
        ]
    return [
        f"no list was found that meets the target with a probability of {task.confidence:.0%}; this "
        "is the likeliest seen. Measuring the room narrows what is not known"
    ]
