"""The modes of a room: which of its surfaces damp which mode."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.air import Air, speed_of_sound
from planner.bands import OCTAVES
from planner.errors import RoomError
from planner.predict.modes import (
    Modes,
    coincidences,
    kind_of,
    mode_decay,
    rectangular_modes,
    third_octave_count,
)
from planner.predict.proportions import Candidate, Criterion, criteria, rated
from planner.room.model import Room
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class RoomModes:
    """Modes of one room, counted and judged."""

    modes: Modes
    highest_hz: float
    schroeder_hz: float
    bands_hz: tuple[float, ...]
    """One-third octaves. [Hz]"""
    count: Array
    """Modes in each, shape ``(band,)``."""
    criteria: tuple[Criterion, ...]
    """Empty where the room is no rectangle."""
    rating: Candidate | None
    warnings: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """What ``planner modes --json`` prints."""
        modes = self.modes
        return {
            "modes": [
                {
                    "hz": float(hz),
                    "n": row,
                    "kind": kind,
                    "t_s": float(t) if np.isfinite(t) else None,
                }
                for hz, row, kind, t in zip(
                    modes.hz, modes.orders.tolist(), modes.kinds, modes.t_s, strict=True
                )
            ],
            "schroeder_hz": self.schroeder_hz,
            "third_octave_count": [
                {"band_hz": hz, "count": int(n)}
                for hz, n in zip(self.bands_hz, self.count, strict=True)
            ],
            "coincidences": [
                [float(modes.hz[a]), float(modes.hz[b])] for a, b in coincidences(modes.hz)
            ],
            "criteria": [
                {
                    "name": one.name,
                    "holds": bool(one.holds),
                    "numbers": one.numbers,
                    "source": one.source,
                }
                for one in self.criteria
            ],
            "rating": None if self.rating is None else self.rating.to_json(),
            "warnings": list(self.warnings),
        }


def wall_alpha(surfaces: RoomSurfaces) -> dict[str, Array]:
    """Mean coefficient of every surface, patches, openings and panels included. [-]."""
    found: dict[str, Array] = {}
    for name in dict.fromkeys(part.on for part in surfaces.parts):
        mine = np.array([part.on == name for part in surfaces.parts])
        area = surfaces.area[mine]
        total = float(area.sum())
        found[name] = area @ surfaces.alpha[mine] / total if total > 0 else np.zeros(len(OCTAVES))
    return found


def room_modes(
    room: Room, surfaces: RoomSurfaces, air: Air, highest_hz: float, schroeder_hz: float
) -> RoomModes:
    """Modes of a room up to a frequency, with their decay.

    Parameters
    ----------
    room, surfaces, air
        The room, what absorbs in it, its air.
    highest_hz
        [Hz]
    schroeder_hz
        From the prediction, to be carried along. [Hz]

    Raises
    ------
    RoomError
        More modes than anyone can read: the limit is too high for the room.
    """
    speed = float(speed_of_sound(air.temperature_c))
    expected = 4.19 * surfaces.volume * (highest_hz / speed) ** 3
    if expected > 20_000:
        raise RoomError(
            f"the room has about {expected:.0f} modes below {highest_hz:g} Hz",
            cure=f"Its statistics begin at {schroeder_hz:.0f} Hz: ask for modes up to there.",
        )
    if not room.is_rectangle:
        return _plan_modes(room, surfaces, speed, highest_hz, schroeder_hz)
    hz, orders = rectangular_modes(room.dimensions, highest_hz, speed_of_sound=speed)
    decay = mode_decay(
        hz,
        orders,
        room.dimensions,
        wall_alpha(surfaces),
        speed_of_sound=speed,
        further_area=surfaces.item_count @ surfaces.item_area,
    )
    bands, count = third_octave_count(hz, highest_hz)
    return RoomModes(
        modes=Modes(hz, orders, kind_of(orders), decay),
        highest_hz=highest_hz,
        schroeder_hz=schroeder_hz,
        bands_hz=bands,
        count=count,
        criteria=tuple(criteria(room.dimensions, speed_of_sound=speed)),
        rating=rated(room.dimensions, speed_of_sound=speed)[0],
        warnings=(
            "The walls are taken as rigid for the frequencies; real ones shift a few percent.",
        ),
    )


def _plan_modes(
    room: Room, surfaces: RoomSurfaces, speed: float, highest_hz: float, schroeder_hz: float
) -> RoomModes:
    from planner.predict.plan_modes import extruded_modes

    modes = extruded_modes(
        room.footprint,
        room.height,
        highest_hz,
        wall_alpha(surfaces),
        room.wall_names,
        speed_of_sound=speed,
        further_area=surfaces.item_count @ surfaces.item_area,
    )
    bands, count = third_octave_count(modes.hz, highest_hz)
    return RoomModes(
        modes=modes,
        highest_hz=highest_hz,
        schroeder_hz=schroeder_hz,
        bands_hz=bands,
        count=count,
        criteria=(),
        rating=None,
        warnings=(
            "Modes of this footprint are found by finite elements in plan; criteria for proportions "
            "hold for rectangles only and are left out.",
        ),
    )
