"""One room to be treated: what is asked, checked and turned into arrays."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.air import Air
from planner.errors import OptionError
from planner.predict.prediction import predict
from planner.predict.targets import TargetLimits
from planner.room.model import TreatmentLimits
from planner.room.surfaces import RoomSurfaces
from planner.treat.catalogue import Catalogue
from planner.treat.choosing import problem
from planner.treat.covers import Cover
from planner.treat.problem import Problem
from planner.treat.windows import Windows, formulas, judged_bands, windows

Array = NDArray[np.float64]


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
    item_draws: Array | None
    confidence: float | None
    name: str
    seed: int

    @property
    def names(self) -> tuple[str, ...]:
        """Formulas that must meet the target."""
        return formulas(self.limits.formula)


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
    item_draws: Array | None = None,
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
        item_draws=item_draws,
        confidence=confidence,
        name=name,
        seed=seed,
    )


def times_by(task: Task, room: RoomSurfaces, names: Sequence[str]) -> dict[str, Array]:
    """Reverberation times of a room by the predictor's formulas, ``(band,)`` each. [s]."""
    methods = predict(room, task.air, task.target, methods=names, draws=0).methods
    return {name: methods[name] for name in names}
