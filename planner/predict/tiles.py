"""A room's surfaces cut into convex pieces of one material each, for ray tracing."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from planner.room.geometry import Frame, geometry, rectangle_corners
from planner.room.model import Room
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]
Rectangle = tuple[float, float, float, float]
"""left, bottom, width, height on a surface. [m]"""

Places = Mapping[int, Sequence[Rectangle]]
"""Where parts of a room lie, by their number in `RoomSurfaces.parts`."""

SMALLEST = 1e-6
"""Pieces under this are rounding. [m²]"""


@dataclass(frozen=True, slots=True)
class Tile:
    """One flat convex piece."""

    surface: str
    corners: Array
    """Anticlockwise as seen from inside, shape ``(corner, 3)``. [m]"""
    alpha: Array
    """Shape ``(band,)``. [-]"""


def described_places(room: Room) -> dict[int, list[Rectangle]]:
    """Where the openings lie, and the patches that have a place.

    Numbers are those of `planner.room.surfaces.room_surfaces`: surfaces, openings, patches.
    """
    first = len(room.surface_materials)
    places = {
        first + n: [(float(o.left), float(o.bottom), float(o.width), float(o.height))]
        for n, o in enumerate(room.openings)
    }
    first += len(room.openings)
    for n, patch in enumerate(room.patches):
        if patch.left is not None and patch.bottom is not None and patch.width and patch.height:
            places[first + n] = [
                (float(patch.left), float(patch.bottom), float(patch.width), float(patch.height))
            ]
    return places


def tiles(room: Room, surfaces: RoomSurfaces, places: Places) -> list[Tile]:
    """Every surface of a room in pieces.

    Parameters
    ----------
    room
        For its frames.
    surfaces
        Parts with areas and coefficients.
    places
        Parts without a place, with places that overlap, or with another area than their places, are
        averaged over what is left of their surface.

    Returns
    -------
    tiles
        They cover each surface once.
    """
    found: list[Tile] = []
    for name, frame in geometry(room).frames.items():
        mine = [n for n, part in enumerate(surfaces.parts) if part.on == name]
        placed = _usable(mine, surfaces, places)
        for number, rectangles in placed.items():
            found += [
                _tile(frame, np.array(rectangle_corners(*each)), surfaces.alpha[number])
                for each in rectangles
            ]
        rest = [n for n in mine if n not in placed]
        area = surfaces.area[rest]
        if not rest or area.sum() <= SMALLEST:
            continue
        alpha = area @ surfaces.alpha[rest] / area.sum()
        taken = [each for rectangles in placed.values() for each in rectangles]
        found += [_tile(frame, piece, alpha) for piece in _remainder(frame, taken)]
    return found


def _tile(frame: Frame, corners: Array, alpha: Array) -> Tile:
    # The ceiling's frame lies over the floor's, so that u, v and the way into the room are a
    # left-handed system there.
    faces_in = float(np.cross(frame.right, frame.up) @ frame.normal) > 0
    return Tile(frame.name, frame.to_room(corners if faces_in else corners[::-1]), alpha)


def _usable(
    parts: Sequence[int], surfaces: RoomSurfaces, places: Places
) -> dict[int, Sequence[Rectangle]]:
    kept: dict[int, Sequence[Rectangle]] = {}
    for number in parts:
        rectangles = places.get(number, ())
        area = sum(width * height for _, _, width, height in rectangles)
        others = [each for one in kept.values() for each in one]
        if rectangles and abs(area - surfaces.area[number]) < 0.01 * area + SMALLEST:
            apart = all(not _overlap(one, other) for one in rectangles for other in others)
            if apart:
                kept[number] = rectangles
    return kept


def _overlap(one: Rectangle, other: Rectangle) -> bool:
    width = min(one[0] + one[2], other[0] + other[2]) - max(one[0], other[0])
    height = min(one[1] + one[3], other[1] + other[3]) - max(one[1], other[1])
    return width > 1e-6 and height > 1e-6


def _remainder(frame: Frame, taken: Sequence[Rectangle]) -> Iterator[Array]:
    """What rectangles leave of a surface, as convex polygons in (u, v), anticlockwise. [m]."""
    if not taken:
        if len(frame.outline) == 4:
            yield frame.outline
            return
    elif len(frame.outline) == 4 and _is_upright(frame.outline):
        yield from _strips(frame.width, frame.height, taken)
        return
    import shapely

    left = shapely.Polygon(frame.outline)
    left = left.difference(
        shapely.union_all([shapely.box(u, v, u + w, v + h) for u, v, w, h in taken])
    )
    for piece in shapely.constrained_delaunay_triangles(left).geoms:
        if piece.area > SMALLEST:
            yield np.asarray(shapely.geometry.polygon.orient(piece).exterior.coords)[:3]


def _is_upright(outline: Array) -> bool:
    return all(len(np.unique(column.round(9))) == 2 for column in outline.T)


def _strips(width: float, height: float, taken: Sequence[Rectangle]) -> Iterator[Array]:
    """Upright strips between the sides of the rectangles, less what they take."""
    cuts = np.unique(
        np.clip(
            [0.0, width, *(u for u, _, _, _ in taken), *(u + w for u, _, w, _ in taken)], 0, width
        ).round(9)
    )
    for left, right in pairwise(cuts.tolist()):
        middle, below = (left + right) / 2.0, 0.0
        across = sorted((v, v + h) for u, v, w, h in taken if u < middle < u + w)
        for bottom, top in [*across, (height, height)]:
            if (bottom - below) * (right - left) > SMALLEST:
                yield np.array(rectangle_corners(left, below, right - left, bottom - below))
            below = max(below, top)
