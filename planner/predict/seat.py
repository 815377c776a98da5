"""A room's seat and loudspeakers: response, reflections, and better places for both."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.air import Air, speed_of_sound
from planner.errors import RoomError
from planner.predict.mode_field import ModeField, mode_field
from planner.predict.modes import Modes
from planner.predict.reflections import Area, Reflection, reflections, serving_area
from planner.predict.response import (
    MODES_TO,
    Extreme,
    Interference,
    boundary_interference,
    extremes,
    frequencies,
    kernel,
    level,
    shape_at,
    unevenness,
)
from planner.predict.room_modes import wall_alpha
from planner.room.geometry import geometry
from planner.room.model import Room
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

FOOTPRINT_HZ = 300.0
"""Responses of rooms that are no rectangles end here: their modes above take minutes. [Hz]"""

SEARCH_STEP = 0.1
"""Of loudspeakers and seat in a search. [m]"""

MOST_TRIED = 20_000

KEEP_OFF = 0.35
"""Loudspeakers and seat keep this from walls. [m]"""


@dataclass(frozen=True, slots=True)
class SeatResponse:
    """What one loudspeaker, or all together, make at the seat."""

    name: str
    hz: Array
    """[Hz]"""
    level_db: Array
    """Against the free field at one metre, shape ``(frequency,)``. [dB]"""
    extremes: tuple[Extreme, ...]
    interference: tuple[Interference, ...]
    unevenness_db: float
    """Standard deviation after a third of an octave of smoothing. [dB]"""


@dataclass(frozen=True, slots=True)
class Seat:
    """Everything about a seat."""

    responses: tuple[SeatResponse, ...]
    """One per loudspeaker, and the last of all together where there are several."""
    modes: Modes
    reflections: tuple[tuple[str, Reflection], ...]
    """Loudspeaker and reflection, earliest first."""
    areas: tuple[Area, ...]
    """Parts of surfaces that serve the seat with a strong early reflection."""
    warnings: tuple[str, ...]

    def to_json(self) -> dict[str, Any]:
        """What ``planner seat --json`` prints."""
        labels = self.modes.labels
        return {
            "responses": [
                {
                    "name": one.name,
                    "hz": one.hz.tolist(),
                    "level_db": one.level_db.tolist(),
                    "unevenness_db": one.unevenness_db,
                    "extremes": [
                        {
                            "hz": extreme.hz,
                            "level_db": extreme.level_db,
                            "kind": "peak" if extreme.is_peak else "dip",
                            "modes": [labels[n] for n in extreme.modes],
                        }
                        for extreme in one.extremes
                    ],
                    "interference": [
                        {"surface": i.surface, "hz": i.hz, "excess_m": i.excess}
                        for i in one.interference
                    ],
                }
                for one in self.responses
            ],
            "reflections": [
                {
                    "loudspeaker": name,
                    "surfaces": list(one.surfaces),
                    "delay_ms": 1000.0 * one.delay,
                    "level_db": one.judged_db,
                    "points_m": one.points.tolist(),
                    "too_strong": one.is_early_and_strong,
                }
                for name, one in self.reflections
            ],
            "areas": [
                {
                    "surface": area.surface,
                    "left_m": area.left,
                    "bottom_m": area.bottom,
                    "width_m": area.width,
                    "height_m": area.height,
                }
                for area in self.areas
            ],
            "warnings": list(self.warnings),
        }


@dataclass(frozen=True, slots=True)
class Places:
    """Where loudspeakers and seat would stand better."""

    seat: tuple[float, float, float]
    loudspeakers: tuple[tuple[float, float, float], tuple[float, float, float]]
    before_db: float
    """Unevenness where they are. [dB]"""
    after_db: float
    """Unevenness there. [dB]"""
    tried: int

    def to_json(self) -> dict[str, Any]:
        """For ``planner seat --search --json``."""
        return {
            "seat": list(self.seat),
            "loudspeakers": [list(one) for one in self.loudspeakers],
            "unevenness_before_db": self.before_db,
            "unevenness_after_db": self.after_db,
            "tried": self.tried,
        }


def seat(room: Room, surfaces: RoomSurfaces, air: Air, schroeder_hz: float) -> Seat:
    """Response and reflections at the seat of a room.

    Parameters
    ----------
    room, surfaces, air
        With a seat and loudspeakers; untreated or treated.
    schroeder_hz
        The response reaches to twice that. [Hz]

    Raises
    ------
    RoomError
        The room has no seat or no loudspeakers.
    """
    if room.positions.seat is None or not room.positions.loudspeakers:
        raise RoomError(
            "there is no seat, or no loudspeaker",
            where="[positions]",
            cure="Give seat = [x, y, z] and loudspeakers = [[x, y, z], …].",
        )
    frames = geometry(room).frames
    speed = float(speed_of_sound(air.temperature_c))
    alpha = wall_alpha(surfaces)
    place = room.positions.seat
    found: list[tuple[str, Reflection]] = []
    areas: list[Area] = []
    for number, source in enumerate(room.positions.loudspeakers, 1):
        if np.linalg.norm(np.subtract(source, place)) < 0.1:
            raise RoomError(
                f"loudspeaker {number} stands at the seat", where="[positions]", cure="Move one."
            )
        each = reflections(frames, source, place, alpha, speed_of_sound=speed)
        found += [(f"loudspeaker {number}", one) for one in each]
        for one in each:
            if one.order == 1 and one.is_early_and_strong:
                area = serving_area(frames[one.surfaces[0]], source, place)
                if area is not None:
                    areas.append(area)
    notes: list[str] = []
    highest = 2.0 * schroeder_hz
    if not room.is_rectangle and highest > FOOTPRINT_HZ:
        highest = FOOTPRINT_HZ
        notes.append(
            f"The response ends at {highest:.0f} Hz: modes of a room that is no rectangle are found up "
            "to there."
        )
    responses, modes = _responses(room, surfaces, speed, highest)
    notes.append(
        "The response adds up modes of rigid walls with their damping: it shows where peaks and "
        "dips lie better than how high they are."
    )
    strong = [one for _, one in found if one.is_early_and_strong]
    if strong:
        worst = max(strong, key=lambda one: one.judged_db)
        notes.append(
            f"{len(strong)} reflections within 15 ms are less than 10 dB down (ITU-R BS.1116, from "
            f"memory), the strongest by {' and '.join(worst.surfaces)}, {worst.judged_db:.1f} dB after "
            f"{1000 * worst.delay:.1f} ms."
        )
    return Seat(
        responses=responses,
        modes=modes,
        reflections=tuple(sorted(found, key=lambda one: one[1].delay)),
        areas=tuple(areas),
        warnings=tuple(notes),
    )


def _bass(
    room: Room, surfaces: RoomSurfaces, speed: float, highest_hz: float
) -> tuple[Array, ModeField, NDArray[np.complex128]]:
    """Frequencies, modes, and their kernel."""
    hz = frequencies(highest_hz)
    field = mode_field(room, surfaces, speed, MODES_TO * highest_hz)
    modes = field.modes
    return hz, field, kernel(hz, modes.hz, modes.t_s, surfaces.volume, speed_of_sound=speed)


def _responses(
    room: Room, surfaces: RoomSurfaces, speed: float, highest_hz: float
) -> tuple[tuple[SeatResponse, ...], Modes]:
    hz, field, answer = _bass(room, surfaces, speed, highest_hz)
    frames = geometry(room).frames
    place = room.positions.seat
    assert place is not None
    at_seat = field.shape_at(place)
    found = []
    together = np.zeros_like(answer)
    for number, source in enumerate(room.positions.loudspeakers, 1):
        parts = answer * at_seat * field.shape_at(source)
        together = together + parts
        interference = boundary_interference(frames, source, place, speed_of_sound=speed)
        found.append(_one(f"loudspeaker {number}", hz, parts, tuple(interference)))
    if len(found) > 1:
        found.append(_one("together", hz, together, ()))
    return tuple(found), field.modes


def _one(
    name: str, hz: Array, parts: NDArray[np.complex128], interference: tuple[Interference, ...]
) -> SeatResponse:
    curve = level(parts.sum(axis=1))
    return SeatResponse(
        name, hz, curve, tuple(extremes(hz, parts)), interference, float(unevenness(curve, hz))
    )


def better_places(
    room: Room,
    surfaces: RoomSurfaces,
    air: Air,
    schroeder_hz: float,
    *,
    reach: float = 0.6,
    most: int = MOST_TRIED,
) -> Places:
    """Places near the present ones with the flattest bass, mirrored about the room's axis.

    Parameters
    ----------
    room, surfaces, air, schroeder_hz
        As `seat`; two loudspeakers and a rectangular room.
    reach
        How far the loudspeakers and the seat may move either way. [m]
    most
        Arrangements tried at most.

    Raises
    ------
    RoomError
        The room is no rectangle or has no pair of loudspeakers.
    """
    spots = room.positions
    if not room.is_rectangle or spots.seat is None or len(spots.loudspeakers) != 2:
        raise RoomError(
            "a search needs a rectangular room, a seat and two loudspeakers",
            where="[positions]",
            cure="Describe them, or move things by hand and look at the response.",
        )
    speed = float(speed_of_sound(air.temperature_c))
    # Above the Schroeder frequency places matter less, and the modes there cost the most.
    hz, field, answer = _bass(room, surfaces, speed, max(schroeder_hz, 120.0))
    length, width, _ = room.dimensions
    grid = _grid(spots.seat, spots.loudspeakers, length, width, reach, most)
    speakers, seats = grid
    curves = pair_levels(answer, field.modes.orders, room.dimensions, speakers, seats, width)
    spread = unevenness(curves, hz)
    best = int(np.argmin(spread))
    pair = field.shape_at(spots.loudspeakers)
    present = pair.sum(axis=0) * field.shape_at(spots.seat)
    before = float(unevenness(level(answer @ present), hz))
    x, y, z = (float(v) for v in speakers[best])
    place = seats[best]
    return Places(
        seat=(float(place[0]), float(place[1]), float(place[2])),
        loudspeakers=((x, y, z), (x, width - y, z)),
        before_db=before,
        after_db=min(float(spread[best]), before),
        tried=len(speakers),
    )


def pair_levels(
    answer: NDArray[np.complex128],
    orders: NDArray[np.intp],
    dimensions: tuple[float, float, float],
    speakers: Array,
    seats: Array,
    width: float,
) -> Array:
    """Level at a seat of a mirrored pair of loudspeakers, for many arrangements at once.

    Parameters
    ----------
    answer
        `planner.predict.response.kernel`, shape ``(frequency, mode)``.
    orders, dimensions
        Of the modes and the room.
    speakers, seats
        Left loudspeaker and seat of each arrangement, shape ``(arrangement, 3)``. [m]
    width
        Of the room, for the mirror image. [m]

    Returns
    -------
    level_db
        Shape ``(arrangement, frequency)``. [dB]
    """
    mirror = speakers * [1.0, -1.0, 1.0] + [0.0, width, 0.0]
    weights = shape_at(speakers, orders, dimensions) + shape_at(mirror, orders, dimensions)
    weights = weights * shape_at(seats, orders, dimensions)
    # Single precision holds 0.01 dB, and halves the work.
    return level(weights.astype(np.complex64) @ answer.T.astype(np.complex64))


def _grid(
    place: tuple[float, float, float],
    loudspeakers: tuple[tuple[float, float, float], ...],
    length: float,
    width: float,
    reach: float,
    most: int,
) -> tuple[Array, Array]:
    """Arrangements around the present one; the seat stays on the room's axis."""
    left = min(loudspeakers, key=lambda one: one[1])
    step = SEARCH_STEP
    while True:
        offsets = np.arange(-round(reach / step), round(reach / step) + 1) * step
        if len(offsets) ** 3 <= most:
            break
        step *= 1.2
    dx, dy, ds = (axis.ravel() for axis in np.meshgrid(offsets, offsets, offsets, indexing="ij"))
    speakers = np.stack([left[0] + dx, left[1] + dy, np.full(len(dx), left[2])], axis=1)
    seats = np.stack(
        [place[0] + ds, np.full(len(dx), width / 2), np.full(len(dx), place[2])], axis=1
    )
    allowed = (
        (speakers[:, 0] >= KEEP_OFF)
        & (speakers[:, 1] >= KEEP_OFF)
        & (speakers[:, 1] <= width / 2 - 0.3)
        & (seats[:, 0] <= length - KEEP_OFF)
        & (seats[:, 0] - speakers[:, 0] >= 0.6)
    )
    if not allowed.any():
        raise RoomError(
            "nothing can be moved within what the room allows",
            where="[positions]",
            cure="Put the loudspeakers before the seat, away from walls.",
        )
    return speakers[allowed], seats[allowed]


def first_reflection_areas(room: Room, found: Seat) -> Mapping[str, list[Area]]:
    """The areas that serve the seat, by surface; surfaces that stay clear are left out."""
    kept: dict[str, list[Area]] = {}
    for area in found.areas:
        if area.surface not in room.treatment.keep_clear:
            kept.setdefault(area.surface, []).append(area)
    return kept
