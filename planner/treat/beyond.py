"""Checked beyond the formula: the list run through other ways of predicting, and corrected.

A diffuse-field formula does not see where the panels are. The directional formulas do, and so does
a simulation. Where they say that a list misses the target, limits are added and the programme is
solved again: for Arau-Puchades its formula by tangents, for a simulation the target shifted by the
ratio between its times and the formula's, band by band.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.room.surfaces import RoomSurfaces
from planner.treat.describing import describe
from planner.treat.directions import Directions, directions_of
from planner.treat.option import treated
from planner.treat.stages import Clock, Found, cheapest, simplest
from planner.treat.suggestion import Opinion, SecondOpinion, Suggestion
from planner.treat.task import Task, times_by
from planner.treat.treatment import Cut
from planner.treat.windows import windows

Array = NDArray[np.float64]
Predictor = Callable[[RoomSurfaces], Array]

ROUNDS = 12
"""Corrections tried."""
SIMULATED = "simulated"
DECIDING = ("arau_puchades", SIMULATED)
"""Whose word counts. Fitzroy's formula weighs the longest axis so heavily that it is shown as the
pessimistic end and not obeyed (the geometric mean is never above the arithmetic one)."""
NEAR = 0.02
"""A miss by less than this share of the limit is no disagreement: a formula is no better. [-]"""


def ask_others(
    task: Task,
    answer: Suggestion,
    first: Found,
    directional: bool,
    simulation: Predictor | None,
    clock: Clock,
    gap: float,
) -> SecondOpinion | None:
    """What other predictors say of a suggestion, and a list on which they agree.

    None where there is none to ask (no rectangle, no simulation).
    """
    room = treated(task.surfaces, answer.option, task.catalogue)
    opinions = opinions_on(task, room, directional, simulation)
    deciding = [opinion for opinion in opinions if opinion.method in DECIDING]
    if not deciding:
        return None
    missed = [opinion for opinion in deciding if opinion.outside_hz]
    if not missed:
        return SecondOpinion(opinions, True, f"{_names(deciding)} agrees")
    if not answer.meets_target:
        return SecondOpinion(
            opinions, False, f"the target is missed by the formula and by {_names(missed)}"
        )
    corrected = _corrected(task, room, opinions, first, directional, simulation, clock, gap)
    where = "; ".join(_where(opinion) for opinion in missed)
    if corrected is None:
        says = f"they do not agree: {where}; no list was found on which they do"
        return SecondOpinion(opinions, False, says)
    more = corrected.cost - answer.cost
    says = f"they do not agree: {where}; a list on which they do costs {more:.2f} {answer.currency} more"
    return SecondOpinion(opinions, False, says, corrected)


def opinions_on(
    task: Task, room: RoomSurfaces, directional: bool, simulation: Predictor | None
) -> tuple[Opinion, ...]:
    """The times that other predictors give a room."""
    times: dict[str, Array] = {}
    if directional:
        asked = ("fitzroy", "arau_puchades")
        times |= times_by(task, room, asked)
    if simulation is not None:
        times[SIMULATED] = np.asarray(simulation(room), float)
    return tuple(
        Opinion(name, values, _outside(task, values))
        for name, values in times.items()
        if np.isfinite(values).any()
    )


def _outside(task: Task, times: Array) -> tuple[int, ...]:
    long = times > np.where(np.isfinite(task.target.high), task.target.high, np.inf) * (1 + NEAR)
    short = times < np.where(np.isfinite(task.target.low), task.target.low, 0.0) * (1 - NEAR)
    return tuple(hz for hz, out in zip(OCTAVES, task.judged & (long | short), strict=True) if out)


def _corrected(
    task: Task,
    room: RoomSurfaces,
    opinions: tuple[Opinion, ...],
    first: Found,
    directional: bool,
    simulation: Predictor | None,
    clock: Clock,
    gap: float,
) -> Suggestion | None:
    """Solve again with corrected limits until the others agree; None where that does not happen."""
    cuts, amounts = list(first.cuts), first.amounts
    main = task.names[0]
    directions = directions_of(task) if directional else None
    axial = None
    if directions is not None:
        axial = directions.below(np.where(task.judged, task.target.high * (1 + NEAR), np.nan))
    for _ in range(ROUNDS):
        own = times_by(task, room, (main,))[main]
        low, high = _shifted(task, own, opinions)
        limits = windows(task.surfaces, task.air, low, high, task.names)
        if directions is not None:
            cuts += directional_cuts(task, directions, amounts)
        found = cheapest(task.problem, limits, task.judged, clock, gap=gap, cuts=cuts, axial=axial)
        if found is None:
            return None
        amounts = found.amounts
        room = treated(task.surfaces, task.problem.option(amounts, task.name), task.catalogue)
        opinions = opinions_on(task, room, directional, simulation)
        if _agree(opinions):
            tidy = simplest(task.problem, limits, task.judged, found, clock, cuts=cuts, axial=axial)
            return _described(task, tidy, directional, simulation) or _described(
                task, found, directional, simulation
            )
    return None


def _agree(opinions: tuple[Opinion, ...]) -> bool:
    return not any(o.outside_hz for o in opinions if o.method in DECIDING)


def _described(
    task: Task, found: Found, directional: bool, simulation: Predictor | None
) -> Suggestion | None:
    """The list as a suggestion, where formula and other predictors see it inside the target."""
    room = treated(task.surfaces, task.problem.option(found.amounts, task.name), task.catalogue)
    opinions = opinions_on(task, room, directional, simulation)
    answer = describe(replace(task, name=f"{task.name}, agreed by {_names(opinions)}"), found)
    if not answer.meets_target or not _agree(opinions):
        return None
    agreed = SecondOpinion(opinions, True, f"{_names(opinions)} agrees")
    return replace(answer, second_opinion=agreed)


def directional_cuts(task: Task, directions: Directions, amounts: Array) -> list[Cut]:
    """Tangents to the Arau-Puchades time at a list, one for each limit it passes there.

    For upper limits exact while no axis has a mean coefficient above 0.63; for lower limits a local
    approximation. What they lead to is checked with the formula itself.
    """
    times, slopes = directions.times(amounts), directions.slopes(amounts)
    cuts = []
    for band in np.flatnonzero(task.judged):
        high = task.target.high[band] * (1 + NEAR)
        low = task.target.low[band] * (1 - NEAR)
        slope = slopes[:, band]
        here = float(slope @ amounts)
        if times[band] > high:  # −ln T + slope · (x − here) ≥ −ln high
            cuts.append(Cut(slope, here + float(np.log(times[band] / high))))
        elif times[band] < low:
            cuts.append(Cut(-slope, -here + float(np.log(low / times[band]))))
    return cuts


def _shifted(task: Task, own: Array, opinions: tuple[Opinion, ...]) -> tuple[Array, Array]:
    """Limits on the formula's time: its own, and those a simulation would set by its ratio to it."""
    low = np.asarray(task.target.low, float).copy()
    high = np.asarray(task.target.high, float).copy()
    for opinion in opinions:
        if opinion.method != SIMULATED:
            continue
        ratio = opinion.reverberation_time / own
        ratio = np.where(np.isfinite(ratio), ratio, 1.0)
        low = np.fmax(low, task.target.low / ratio)
        high = np.fmin(high, task.target.high / ratio)
    return low, high


_WORDS = {"arau_puchades": "Arau-Puchades", "fitzroy": "Fitzroy", SIMULATED: "the simulation"}


def _names(opinions: tuple[Opinion, ...] | list[Opinion]) -> str:
    return " and ".join(
        _WORDS[opinion.method] for opinion in opinions if opinion.method in DECIDING
    )


def _where(opinion: Opinion) -> str:
    times = dict(zip(OCTAVES, opinion.reverberation_time, strict=True))
    bands = ", ".join(f"{times[hz]:.2f} s at {hz} Hz" for hz in opinion.outside_hz)
    return f"{_WORDS[opinion.method]} sees {bands}"
