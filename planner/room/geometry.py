"""A footprint polygon and a height: volume, areas, wall frames, mean free path."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.room.model import Room


@dataclass(frozen=True, slots=True)
class Frame:
    """Where one surface lies, and the two directions drawings and panels are measured along."""

    name: str
    origin: NDArray[np.float64]
    """Its named corner: the lower left one as seen from inside. [m]"""
    right: NDArray[np.float64]
    """Unit vector along u."""
    up: NDArray[np.float64]
    """Unit vector along v."""
    normal: NDArray[np.float64]
    """Unit vector into the room."""
    width: float
    """Extent along u. [m]"""
    height: float
    """Extent along v. [m]"""
    outline: NDArray[np.float64]
    """Corners in (u, v), anticlockwise as seen from inside, shape ``(corner, 2)``. [m]"""

    def to_room(self, uv: ArrayLike) -> NDArray[np.float64]:
        """Points ``(..., 2)`` on this surface as room coordinates ``(..., 3)``. [m]."""
        points = np.asarray(uv, float)
        return self.origin + points[..., :1] * self.right + points[..., 1:] * self.up

    def to_surface(self, xyz: ArrayLike) -> NDArray[np.float64]:
        """Room coordinates ``(..., 3)`` as (u, v) ``(..., 2)``, projected along the normal. [m]."""
        offset = np.asarray(xyz, float) - self.origin
        return np.stack([offset @ self.right, offset @ self.up], axis=-1)


@dataclass(frozen=True, slots=True)
class Geometry:
    """Sizes of a room."""

    volume: float
    """[m³]"""
    surface_area: float
    """Floor, ceiling and walls. [m²]"""
    floor_area: float
    """[m²]"""
    perimeter: float
    """[m]"""
    frames: dict[str, Frame]
    """By surface name."""
    areas: dict[str, float]
    """Gross area by surface name, openings included. [m²]"""

    @property
    def mean_free_path(self) -> float:
        """4 V / S of a diffuse field. [m]."""
        return 4.0 * self.volume / self.surface_area


def polygon_area(corners: ArrayLike) -> float:
    """Signed area of a polygon ``(corner, 2)``: positive when anticlockwise. [m²]."""
    x, y = np.asarray(corners, float).T
    return float(0.5 * np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


def geometry(room: Room) -> Geometry:
    """Volume, areas and frames of a room.

    The walls follow the footprint's edges; seen from inside, the left end of an edge is its second
    corner, because the corners run anticlockwise. The ceiling's frame is that of a reflected
    ceiling plan: it lies over the floor's.
    """
    footprint, height = room.footprint, room.height
    floor_area = polygon_area(footprint)
    edges = np.roll(footprint, -1, axis=0) - footprint
    lengths = np.hypot(*edges.T)
    frames = {
        "floor": _level(footprint, 0.0, "floor"),
        "ceiling": _level(footprint, height, "ceiling"),
    }
    for name, start, edge, length in zip(room.wall_names, footprint, edges, lengths, strict=True):
        frames[name] = _wall(name, start, edge / length, float(length), height)
    areas = {"floor": floor_area, "ceiling": floor_area}
    areas |= {name: frames[name].width * height for name in room.wall_names}
    perimeter = float(lengths.sum())
    return Geometry(
        volume=floor_area * height,
        surface_area=2.0 * floor_area + perimeter * height,
        floor_area=floor_area,
        perimeter=perimeter,
        frames=frames,
        areas=areas,
    )


def _level(footprint: NDArray[np.float64], z: float, name: str) -> Frame:
    """Frame of the floor (z = 0) or the ceiling: u along x, v along y."""
    corner = footprint.min(axis=0)
    size = np.ptp(footprint, axis=0)
    return Frame(
        name=name,
        origin=np.array([*corner, z]),
        right=np.array([1.0, 0.0, 0.0]),
        up=np.array([0.0, 1.0, 0.0]),
        normal=np.array([0.0, 0.0, 1.0 if z == 0.0 else -1.0]),
        width=float(size[0]),
        height=float(size[1]),
        outline=footprint - corner,
    )


def _wall(
    name: str, start: NDArray[np.float64], along: NDArray[np.float64], length: float, height: float
) -> Frame:
    end = start + along * length
    return Frame(
        name=name,
        origin=np.array([*end, 0.0]),
        right=np.array([*-along, 0.0]),
        up=np.array([0.0, 0.0, 1.0]),
        normal=np.array([-along[1], along[0], 0.0]),
        width=length,
        height=height,
        outline=np.array([(0, 0), (length, 0), (length, height), (0, height)], float),
    )


def rectangle_corners(
    left: float, bottom: float, width: float, height: float
) -> Sequence[tuple[float, float]]:
    """Corners of a rectangle in (u, v), anticlockwise. [m]."""
    right, top = left + width, bottom + height
    return ((left, bottom), (right, bottom), (right, top), (left, top))
