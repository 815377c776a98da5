"""A project folder, and the steps on it that the commands and the browser pages share.

Enters: the folder, or its ``room.toml``. Leaves: results of `planner.predict`, `planner.reconcile`
and `planner.treat`. Nothing here prints or draws; `planner.handover` makes papers of it.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from planner.absorption.library import Library
from planner.air import Air, speed_of_sound
from planner.errors import OptionError, PlannerError, RoomError
from planner.predict.prediction import Prediction, predict
from planner.predict.targets import TargetLimits, target_of
from planner.room.checks import room_warnings
from planner.room.files import read_room
from planner.room.geometry import Geometry, geometry
from planner.room.model import Room, TreatmentLimits
from planner.room.surfaces import RoomSurfaces, room_library, room_surfaces

if TYPE_CHECKING:
    from planner.measure.measured import Measured
    from planner.predict.room_modes import RoomModes
    from planner.predict.seat import Places, Seat
    from planner.reconcile.calibration import Calibration
    from planner.reconcile.compare import Comparison
    from planner.reconcile.proof import Proof
    from planner.treat.alternatives import FrontPoint
    from planner.treat.catalogue import Catalogue
    from planner.treat.covers import Cover
    from planner.treat.optimise import Task
    from planner.treat.option import Option
    from planner.treat.placement import Placement
    from planner.treat.suggestion import Suggestion

POSTERIOR_DRAWS = 600
"""Variants of a calibrated room that the robust optimiser looks at."""

PLACING_ROUNDS = 4
"""How often a list that cannot be hung is solved again with what could be."""


@dataclass(frozen=True, slots=True)
class _Asked:
    """What the optimiser is asked about."""

    arguments: tuple[RoomSurfaces, Air, TargetLimits, Catalogue, TreatmentLimits]
    draws: NDArray[np.float64] | None


@dataclass(frozen=True)
class Project:
    """One room with what lies beside its file."""

    room: Room
    folder: Path
    room_file: Path | None = None

    @cached_property
    def library(self) -> Library:
        """Materials the room may name."""
        return room_library(self.room)

    @cached_property
    def surfaces(self) -> RoomSurfaces:
        """Areas and coefficients of the room as described."""
        try:
            return room_surfaces(self.room)
        except RoomError as error:
            raise _in_file(error, self.room_file) from error

    @cached_property
    def geometry(self) -> Geometry:
        """Sizes and frames of the room."""
        return geometry(self.room)

    @property
    def air(self) -> Air:
        """The air in the room."""
        return self.room.air_state()

    @cached_property
    def target(self) -> TargetLimits | None:
        """What the room is to reach."""
        try:
            return target_of(self.room, self.geometry.volume)
        except RoomError as error:
            raise _in_file(error, self.room_file) from error

    @cached_property
    def catalogue(self) -> Catalogue:
        """The project's own ``catalogue.csv``, or the generic products."""
        from planner.treat.catalogue import builtin_catalogue, read_catalogue

        own = self.folder / "catalogue.csv"
        return read_catalogue(own) if own.is_file() else builtin_catalogue()

    @property
    def warnings(self) -> tuple[str, ...]:
        """Doubts about the description."""
        return room_warnings(self.room)

    @property
    def formula(self) -> str:
        """The one that intervals, verdicts and comparisons belong to."""
        return "sabine" if self.room.treatment.formula == "sabine" else "eyring"

    def summary(self) -> dict[str, Any]:
        """What ``planner check --json`` prints."""
        surfaces, shape = self.surfaces, self.geometry
        return {
            "name": self.room.name,
            "volume_m3": shape.volume,
            "surface_m2": shape.surface_area,
            "mean_free_path_m": shape.mean_free_path,
            "state": self.room.described_state,
            "surfaces": [
                {
                    "name": part.name,
                    "on": part.on,
                    "material": part.material,
                    "area_m2": float(area),
                    "alpha": alpha.tolist(),
                    "assumed": assumed.tolist(),
                }
                for part, area, alpha, assumed in zip(
                    surfaces.parts, surfaces.area, surfaces.alpha, surfaces.assumed, strict=True
                )
            ],
            "furnishings": [
                {"item": name, "count": float(count), "area_m2": area.tolist()}
                for name, count, area in zip(
                    surfaces.items, surfaces.item_count, surfaces.item_area, strict=True
                )
            ],
            "target": None if self.target is None else self.target.name,
            "warnings": list(self.warnings),
        }

    def calibration(self, measured: Measured) -> Calibration:
        """The coefficients of the untreated room that its measurement asks for.

        Raises
        ------
        MeasuredError
            The measurement is of another state or unit, or says nothing.
        """
        from planner.reconcile.calibrate import calibrate_room

        return calibrate_room(self.room, measured)

    def before(self, measured: Measured | None = None) -> RoomSurfaces:
        """The untreated room, as described or as its measurement corrects it."""
        return self.surfaces if measured is None else self.calibration(measured).surfaces

    def after(self, option: Option, measured: Measured | None = None) -> RoomSurfaces:
        """The room with a treatment in place.

        Raises
        ------
        OptionError
            It does not fit the room or the catalogue.
        """
        from planner.treat.option import treated

        return treated(self.before(measured), option, self.catalogue)

    def predict(
        self,
        option: Option | None = None,
        measured: Measured | None = None,
        *,
        simulate: bool = False,
        progress: Callable[[float, float], None] | None = None,
    ) -> Prediction:
        """Reverberation times of the room, treated or not, calibrated or not, and simulated.

        `progress` is told the share of the simulation that is done, and the seconds it still needs.
        """
        surfaces = self.before(measured) if option is None else self.after(option, measured)
        prediction = predict(surfaces, self.air, self.target, formula=self.formula)
        if simulate:
            prediction = self._simulated(prediction, surfaces, option, progress)
        return prediction

    def _simulated(
        self,
        prediction: Prediction,
        surfaces: RoomSurfaces,
        option: Option | None,
        progress: Callable[[float, float], None] | None,
    ) -> Prediction:
        from planner.predict.prediction import with_method
        from planner.predict.simulation import simulate_room
        from planner.predict.tiles import described_places
        from planner.treat.option import panel_places

        places: dict[int, Any] = dict(described_places(self.room))
        if option is not None:
            hung = self.place(option).in_option(option)
            places |= panel_places(self.surfaces, hung, self.catalogue)
        result = simulate_room(self.room, surfaces, self.air, places=places, progress=progress)
        with_it = with_method(prediction, "simulated", result.reverberation_time)
        return replace(with_it, warnings=(*with_it.warnings, *result.notes))

    def modes(self, highest_hz: float) -> RoomModes:
        """Modes up to a frequency, with their decay."""
        from planner.predict.room_modes import room_modes

        schroeder = self._schroeder(self.surfaces)
        return room_modes(self.room, self.surfaces, self.air, highest_hz, schroeder)

    def seat(self, option: Option | None = None) -> Seat:
        """Response and first reflections at the seat, treated or not."""
        from planner.predict.seat import seat

        surfaces = self.surfaces if option is None else self.after(option)
        return seat(self.room, surfaces, self.air, self._schroeder(surfaces))

    def better_places(self) -> Places:
        """Places of loudspeakers and seat with a flatter bass."""
        from planner.predict.seat import better_places

        return better_places(self.room, self.surfaces, self.air, self._schroeder(self.surfaces))

    def _schroeder(self, surfaces: RoomSurfaces) -> float:
        return predict(surfaces, self.air, draws=0, formula=self.formula).schroeder_hz

    def _covers(self) -> list[Cover]:
        """First reflections that a treatment must cover, where the room file asks for it."""
        from planner.predict.seat import first_reflection_areas
        from planner.treat.covers import Cover

        if not self.room.treatment.cover_first_reflections:
            return []
        areas = first_reflection_areas(self.room, self.seat())
        return [
            Cover(area.surface, area.left, area.bottom, area.width, area.height)
            for each in areas.values()
            for area in each
        ]

    def compare(self, measured: Measured, option: Option | None = None) -> Comparison:
        """Predicted against measured, with the coefficients that explain the difference."""
        from planner.reconcile.compare import compare, compare_room

        if option is None:
            return compare_room(self.room, measured)
        prediction = self.predict(option)
        return compare(
            prediction,
            measured,
            formula=self.formula,
            state=self.room.described_state,
            air=self.air,
        )

    def prove(
        self, before: Measured, after: Measured, option: Option, confidence: float = 0.9
    ) -> Proof:
        """A treatment judged by measurements before and after it."""
        from planner.reconcile.proof import prove_room

        return prove_room(
            self.surfaces,
            self.after(option),
            self.air,
            before,
            after,
            target=self.target,
            formula=self.room.treatment.formula,
            state=self.room.described_state,
            confidence=confidence,
        )

    def place(self, option: Option) -> Placement:
        """The panels of an option laid on their surfaces.

        Over first reflections first where the room file asks for it, and bass panels where the
        modes of the 63 and 125 Hz octaves press.
        """
        from planner.treat.placement import place

        return place(
            self.room,
            option,
            self.catalogue,
            covers=self._covers(),
            pressure=self._bass_pressure,
        )

    @cached_property
    def _bass_pressure(self) -> dict[str, NDArray[np.float64]]:
        """Where on each surface the modes below 177 Hz and the Schroeder frequency press. [-].

        Above the Schroeder frequency so many modes overlap that no place is better than another.
        """
        from planner.bands import band_edges
        from planner.predict.mode_field import mode_field, wall_pressure

        low, high = band_edges((63, 125))
        highest = min(float(high[-1]), self._schroeder(self.surfaces))
        if highest <= low[0]:
            return {}
        speed = float(speed_of_sound(self.air.temperature_c))
        field = mode_field(self.room, self.surfaces, speed, highest)
        return {
            name: wall_pressure(field, frame, float(low[0]), highest)
            for name, frame in self.geometry.frames.items()
        }

    def suggest(
        self,
        measured: Measured | None = None,
        *,
        budget: float | None = None,
        confidence: float | None = None,
        time_limit: float = 10.0,
        name: str = "suggested",
        second_opinion: bool = True,
        simulate: bool = False,
    ) -> tuple[Suggestion, Placement]:
        """The cheapest treatment inside the target that can also be hung.

        Parameters
        ----------
        measured
            Of the untreated room; the suggestion is then for the room as calibrated by it.
        budget
            Instead of the room file's, in its currency.
        confidence
            Probability with which the target is to be met. [-]
        time_limit
            For each solution. [s]
        name
            Of the option.
        second_opinion
            Ask the directional formulas too.
        simulate
            Ask the simulation as well; where it sees the target missed, the limits are corrected.

        Returns
        -------
        suggestion, placement
            The option of the suggestion carries its places.

        Raises
        ------
        RoomError
            The room has no target.
        """
        from planner.treat.fitting import fitting_limits
        from planner.treat.optimise import suggest

        fitting = fitting_limits(self.room, self.catalogue)
        asked = self._asked(measured, budget)
        for _ in range(PLACING_ROUNDS):
            answer = suggest(
                *asked.arguments,
                area_limits=fitting.area,
                piece_limits=fitting.pieces,
                covers=self._covers(),
                confidence=confidence,
                room_draws=asked.draws,
                time_limit=time_limit,
                second_opinion=second_opinion,
                simulation=self._traced if simulate else None,
                name=name,
            )
            placement = self.place(answer.option)
            if not placement.unplaced:
                break
            fitting = fitting.tightened(placement)
        return replace(answer, option=placement.in_option(answer.option)), placement

    def _traced(self, surfaces: RoomSurfaces) -> NDArray[np.float64]:
        """Reverberation time of a treated room by simulation. [s]."""
        from planner.predict.simulation import simulate_room

        return simulate_room(self.room, surfaces, self.air).reverberation_time

    def alternatives(
        self,
        first: Suggestion,
        measured: Measured | None = None,
        count: int = 2,
        *,
        budget: float | None = None,
    ) -> tuple[Suggestion, ...]:
        """The next cheapest lists that are made of other products than the first."""
        from planner.treat.alternatives import second_best

        found = second_best(self._task(measured, budget, first.option.name), first, count=count)
        return tuple(
            replace(one, option=self.place(one.option).in_option(one.option)) for one in found
        )

    def front(
        self, measured: Measured | None = None, *, budget: float | None = None, points: int = 8
    ) -> tuple[FrontPoint, ...]:
        """Cost against deviation from the target: no list is both cheaper and nearer."""
        from planner.treat.alternatives import front

        return front(self._task(measured, budget, "front"), points=points)

    def _task(self, measured: Measured | None, budget: float | None, name: str) -> Task:
        from planner.treat.fitting import fitting_limits
        from planner.treat.optimise import task_for

        fitting = fitting_limits(self.room, self.catalogue)
        asked = self._asked(measured, budget)
        return task_for(
            *asked.arguments,
            area_limits=fitting.area,
            piece_limits=fitting.pieces,
            covers=self._covers(),
            room_draws=asked.draws,
            name=name,
        )

    def _asked(self, measured: Measured | None, budget: float | None) -> _Asked:
        """The room as calibrated, its target and its limits, for the optimiser."""
        if self.target is None:
            raise _in_file(
                RoomError(
                    "the room has no target to meet",
                    where="[target]",
                    cure='Name one: use = "control-room-bs1116", or low and high of your own.',
                ),
                self.room_file,
            )
        limits = self.room.treatment
        if budget is not None:
            limits = limits.model_copy(update={"budget": budget})
        surfaces, draws = self.surfaces, None
        if measured is not None:
            calibration = self.calibration(measured)
            surfaces, draws = calibration.surfaces, calibration.draws(POSTERIOR_DRAWS, seed=1)
        return _Asked((surfaces, self.air, self.target, self.catalogue, limits), draws)

    def option(self, path: str | Path) -> Option:
        """Read an option and make sure that its products and surfaces exist.

        Raises
        ------
        OptionError
            The file cannot be used with this room.
        """
        from planner.treat.option import read_option, treated

        option = read_option(path)
        try:
            treated(self.surfaces, option, self.catalogue)
        except OptionError as error:
            raise OptionError(
                error.what, file=error.file or path, where=error.where, cure=error.cure
            ) from error
        return option


def open_project(path: str | Path) -> Project:
    """Open a room file, or the folder it lies in.

    Raises
    ------
    RoomError
        The room cannot be used as it stands.
    """
    given = Path(path)
    file = given / "room.toml" if given.is_dir() else given
    return Project(room=read_room(file), folder=file.parent, room_file=file)


def _in_file(error: RoomError, file: Path | None) -> PlannerError:
    """The same refusal with the name of the file."""
    if error.file is not None or file is None:
        return error
    return RoomError(error.what, file=file, where=error.where, cure=error.cure)
