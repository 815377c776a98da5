"""Where in plan a mode is loud: its pressure over the floor, for any footprint."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.errors import RoomError

Array = NDArray[np.float64]

GRID_M = 0.1
"""Distance of the points that are given. [m]"""


@dataclass(frozen=True, slots=True)
class PlanPressure:
    """Pressure of one mode over the plan, at the height where it is largest."""

    x: Array
    """Columns, shape ``(column,)``. [m]"""
    y: Array
    """Rows, shape ``(row,)``. [m]"""
    pressure: Array
    """Relative to its largest value, NaN outside the room, shape ``(row, column)``. [-]"""


def plan_pressure(
    footprint: ArrayLike,
    orders: ArrayLike,
    *,
    rectangle: bool,
    highest_hz: float,
    speed_of_sound: float = 343.0,
) -> PlanPressure:
    """Pressure of one mode over the plan of a room with rigid walls.

    Parameters
    ----------
    footprint
        Corners, anticlockwise, shape ``(corner, 2)``. [m]
    orders
        Of the mode, as in `planner.predict.modes.Modes.orders`.
    rectangle
        Orders are half waves along x and y; otherwise the first is the number of the plan's mode.
    highest_hz
        Up to where the modes were looked for, since that numbers them. [Hz]
    speed_of_sound
        [m/s]

    Raises
    ------
    RoomError
        There is no mode of that number.

    Notes
    -----
    Rectangles: |cos(n π x / L) cos(m π y / W)|, every textbook of room acoustics (for example
    H. Kuttruff, Room Acoustics, chapter 3). Others: finite elements, as `plan_modes`.
    """
    corners = np.asarray(footprint, float)
    low, size = corners.min(axis=0), np.ptp(corners, axis=0)
    count = np.maximum(np.ceil(size / GRID_M).astype(int), 2)
    x, y = (low[n] + (np.arange(count[n]) + 0.5) * size[n] / count[n] for n in (0, 1))
    first, second = (int(n) for n in np.asarray(orders)[:2])
    if rectangle:
        along = np.cos(first * np.pi * (x - low[0]) / size[0])
        across = np.cos(second * np.pi * (y - low[1]) / size[1])
        return PlanPressure(x, y, across[:, None] * along)
    from planner.predict.plan_modes import plan_modes

    plan = plan_modes(corners, 2.0 * np.pi * highest_hz / speed_of_sound)
    if not 0 <= first < len(plan.wavenumber):
        raise RoomError(f"the plan has no mode {first} up to {highest_hz:g} Hz")
    grid = np.stack(np.meshgrid(x, y), axis=-1)
    inside = _inside(grid, corners)
    pressure = np.full(inside.shape, np.nan)
    pressure[inside] = plan.pressure(grid[inside])[first]
    return PlanPressure(x, y, pressure)


def _inside(points: Array, corners: Array) -> NDArray[np.bool_]:
    """Which points lie in the polygon: an odd number of edges is crossed on the way out."""
    inside = np.zeros(points.shape[:-1], bool)
    px, py = points[..., 0], points[..., 1]
    for (ax, ay), (bx, by) in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        if ay == by:
            continue
        between = (ay > py) != (by > py)
        inside ^= between & (px < ax + (py - ay) * (bx - ax) / (by - ay))
    return inside
