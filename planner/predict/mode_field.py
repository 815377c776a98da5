"""The modes of a room as functions of place: at the seat, at a loudspeaker, over a wall."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.predict.modes import Modes, kind_of, mode_decay, rectangular_modes
from planner.predict.response import shape_at
from planner.predict.room_modes import wall_alpha
from planner.room.geometry import Frame
from planner.room.model import Room
from planner.room.surfaces import RoomSurfaces

if TYPE_CHECKING:
    from planner.predict.plan_modes import PlanModes

Array = NDArray[np.float64]

LONGEST_T = 3.0
"""Decay time that the constant pressure mode is given. [s]"""

WALL_GRID = 0.1
"""Distance of the points at which a wall's pressure is given. [m]"""


@dataclass(frozen=True, slots=True)
class ModeField:
    """Modes of a room with the constant one first, and their pressure anywhere in it."""

    modes: Modes
    shape_at: Callable[[ArrayLike], Array]
    """Of points ``(..., 3)`` [m]: mode shapes with mean square one over the room, ``(..., mode)``."""


def mode_field(room: Room, surfaces: RoomSurfaces, speed: float, highest_hz: float) -> ModeField:
    """Modes of any room up to a frequency, as functions of place.

    Parameters
    ----------
    room, surfaces
        The room and what absorbs in it, for the modes' decay.
    speed
        Of sound. [m/s]
    highest_hz
        [Hz]

    Raises
    ------
    RoomError
        So many modes that nobody could wait for them.
    """
    alpha = wall_alpha(surfaces)
    items = surfaces.item_count @ surfaces.item_area
    if room.is_rectangle:
        size = room.dimensions
        hz, orders = rectangular_modes(size, highest_hz, speed_of_sound=speed)
        decay = mode_decay(hz, orders, size, alpha, speed_of_sound=speed, further_area=items)
        modes = _with_constant(Modes(hz, orders, kind_of(orders), decay))
        return ModeField(modes, lambda points: shape_at(points, modes.orders, size))

    from planner.predict.plan_modes import extruded_modes, plan_modes

    plan = plan_modes(room.footprint, 2.0 * np.pi * highest_hz / speed)
    modes = _with_constant(
        extruded_modes(
            room.footprint,
            room.height,
            highest_hz,
            alpha,
            room.wall_names,
            speed_of_sound=speed,
            further_area=items,
            plan=plan,
        )
    )
    return ModeField(modes, lambda points: _extruded_at(points, plan, modes, room.height))


def _with_constant(modes: Modes) -> Modes:
    return Modes(
        np.concatenate([[0.0], modes.hz]),
        np.concatenate([np.zeros((1, 3), np.intp), modes.orders]),
        ("constant", *modes.kinds),
        np.concatenate([[LONGEST_T], np.minimum(modes.t_s, 10 * LONGEST_T)]),
    )


def _extruded_at(points: ArrayLike, plan: PlanModes, modes: Modes, height: float) -> Array:
    places = np.asarray(points, float)
    flat = places.reshape(-1, 3)
    level = plan.pressure(flat[:, :2]) / np.sqrt(plan.mean_square)[:, None]
    upright = modes.orders[:, 2]
    along = np.cos(np.pi * upright * flat[:, 2:] / height) * np.sqrt(
        np.where(upright > 0, 2.0, 1.0)
    )
    shape: Array = level[modes.orders[:, 0]].T * along
    return shape.reshape(*places.shape[:-1], -1)


def wall_pressure(
    field: ModeField, frame: Frame, lowest_hz: float, highest_hz: float
) -> NDArray[np.float64]:
    """How hard the modes of a range of frequencies press on each part of a surface.

    Parameters
    ----------
    field
        Of the room.
    frame
        The surface.
    lowest_hz, highest_hz
        Modes within are counted, each by its decay time: what rings longest is to be damped first.
        [Hz]

    Returns
    -------
    pressure
        Mean square pressure over the surface's bounding box from its lower left corner, relative to
        the mean over the room, shape ``(v, u)``; 0 throughout where there is no such mode. [-]
    """
    columns, rows = (max(round(extent / WALL_GRID), 2) for extent in (frame.width, frame.height))
    counted = (field.modes.hz >= max(lowest_hz, 1e-6)) & (field.modes.hz <= highest_hz)
    if not counted.any():
        return np.zeros((rows, columns))
    u = (np.arange(columns) + 0.5) * frame.width / columns
    v = (np.arange(rows) + 0.5) * frame.height / rows
    shape = field.shape_at(frame.to_room(np.stack(np.meshgrid(u, v), axis=-1)))[..., counted]
    weight = field.modes.t_s[counted]
    pressure: Array = shape**2 @ weight / weight.sum()
    return pressure
