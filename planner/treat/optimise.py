"""The cheapest set of panels that meets the target: the way from a room to a `Suggestion`."""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from planner.air import Air
from planner.predict.targets import TargetLimits
from planner.room.model import TreatmentLimits
from planner.room.surfaces import RoomSurfaces
from planner.treat.beyond import ask_others
from planner.treat.catalogue import Catalogue
from planner.treat.covers import Cover
from planner.treat.describing import describe
from planner.treat.margins import robustly
from planner.treat.option import treated
from planner.treat.problem import Problem
from planner.treat.programme import Status
from planner.treat.reasons import relaxations
from planner.treat.robust import STEERING_DRAWS, area_spread, meets, time_draws
from planner.treat.stages import Clock, Found, cheapest, closest, simplest
from planner.treat.suggestion import SecondOpinion, Suggestion
from planner.treat.task import Task, task_for
from planner.treat.windows import Windows, absorption_area

__all__ = ["Task", "best", "solve", "suggest", "task_for"]

Array = NDArray[np.float64]


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
    item_draws: Array | None = None,
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
    item_draws
        Draws of the furnishings that belong to `room_draws`, ``(draw, item, band)``. [m²]
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
        item_draws=item_draws,
        include_assumed=include_assumed,
        name=name,
        seed=seed,
    )
    clock = Clock(time_limit)
    found = solve(task, clock, gap)
    answer = describe(task, found)
    if explain and answer.status == Status.INFEASIBLE:
        more = relaxations(
            task.problem,
            task.windows,
            task.judged,
            catalogue,
            Clock(time_limit),
            answer.short_bands,
        )
        answer = replace(answer, relaxations=more)
    if second_opinion or simulation is not None:
        opinion = ask_others(
            task, answer, found, second_opinion, simulation, Clock(time_limit), gap
        )
        answer = _agreed(answer, opinion)
    return replace(answer, seconds=time.monotonic() - began)


def _agreed(answer: Suggestion, opinion: SecondOpinion | None) -> Suggestion:
    """The answer with the second opinion; a list on which all agree takes its place at no cost."""
    corrected = opinion.corrected if opinion is not None else None
    if opinion is None or corrected is None or corrected.cost > answer.cost + 1e-9:
        return replace(answer, second_opinion=opinion)
    wanted = min(answer.confidence or 0.0, answer.probability)
    if answer.confidence is not None and corrected.probability < wanted - 0.005:
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
        item_draws=task.item_draws,
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
