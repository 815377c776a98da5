"""Amounts found by the optimiser, checked with the predictor and put into a `Suggestion`."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.predict.prediction import DRAWS
from planner.predict.targets import TargetLimits
from planner.room.surfaces import RoomSurfaces
from planner.treat.catalogue import Catalogue
from planner.treat.option import Option, item_area, treated
from planner.treat.programme import Status
from planner.treat.reasons import binding_limits, short_bands
from planner.treat.robust import meets, time_draws
from planner.treat.stages import Found
from planner.treat.suggestion import SuggestedItem, Suggestion
from planner.treat.task import Task, times_by

Array = NDArray[np.float64]

TOLERANCE = 1e-5
"""Relative excess over a limit that counts as rounding. [-]"""


def describe(task: Task, found: Found) -> Suggestion:
    """The amounts found as a suggestion, checked with the predictor."""
    option = task.problem.option(found.amounts, task.name)
    room = treated(task.surfaces, option, task.catalogue)
    methods = times_by(task, room, ("sabine", "eyring"))
    main = task.names[0]
    untreated = times_by(task, task.surfaces, (main,))[main]
    deviation = max(outside_by(methods[name], task.target, task.judged) for name in task.names)
    times = time_draws(
        room,
        task.air,
        task.names,
        count=DRAWS,
        seed=task.seed,
        room_draws=task.room_draws,
        item_draws=task.item_draws,
    )
    inside = meets(times, task.target, task.judged)
    likely = float(np.mean(inside.all(axis=1)))
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
        probability=likely,
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
        warnings=(*_warnings(task, found, room), *_unsure(task, status, likely)),
    )


def _unsure(task: Task, status: Status, likely: float) -> tuple[str, ...]:
    """Said of a list that meets the target on paper and would miss it more often than not."""
    if task.confidence is not None or status is Status.INFEASIBLE or likely >= 0.5:
        return ()
    return (
        "the list meets the target if every coefficient is as its table says; as uncertain as they "
        f"are, the room does so with a probability of {likely:.0%} only: measure the room, or ask for "
        "a confidence, such as 0.8, to be surer",
    )


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
