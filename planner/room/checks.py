"""What cannot be: footprints that cross, openings that leave their wall, patches too large."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches
from itertools import combinations
from math import inf, log
from typing import TYPE_CHECKING

import numpy as np

from planner.errors import RoomError
from planner.room.lengths import METRES_PER, shown_length

if TYPE_CHECKING:
    from shapely.geometry import Polygon

    from planner.room.geometry import Frame, Geometry
    from planner.room.model import KeepOut, Patch, Room

LARGEST_PLAN = 60.0
"""Beyond this a length is taken for a slip of the unit. [m]"""
LOWEST_ROOM, HIGHEST_ROOM = 1.5, 12.0
"""Heights between which a room is a room. [m]"""
TOLERANCE = 1e-6
"""Rounding that touching edges may show. [m]"""


def check_room(room: Room) -> None:
    """Refuse a room that cannot exist.

    Raises
    ------
    RoomError
        With the key it stands under, the value and what would be right.
    """
    _check_footprint(room)
    _check_sizes(room)
    _check_wall_materials(room)
    _check_names(room)
    from planner.room.geometry import geometry

    shape = geometry(room)
    _check_openings(room, shape)
    _check_covers(room, shape)
    _check_positions(room)


def room_warnings(room: Room) -> tuple[str, ...]:
    """Doubts about a room that can exist, each with its cure."""
    warnings = []
    low, high = shown_length(2.0, room.units), shown_length(6.0, room.units)
    if not 2.0 <= room.height <= 6.0:
        other = {"m": "feet", "ft": "metres"}[room.units]
        warnings.append(
            f"The height {shown_length(room.height, room.units)} is unusual for a small room "
            f"({low} to {high}): were {other} meant?"
        )
    if room.target is None:
        warnings.append("No [target] is given: the prediction is shown without a verdict.")
    names = ", ".join(thing.item for thing in room.furnishings if "person" in thing.item)
    if names and room.state not in (None, "occupied"):
        warnings.append(f"The room is called {room.state} but holds {names}: which is meant?")
    return tuple(warnings)


def _check_sizes(room: Room) -> None:
    extents = [("height", room.height)]
    if room.shape.length is not None and room.shape.width is not None:
        # As written: the extent of a footprint built from them would hide a minus sign.
        extents += [("length", room.shape.length), ("width", room.shape.width)]
    else:
        length, width, _ = room.dimensions
        extents += [("footprint, extent along x", length), ("footprint, extent along y", width)]
    for key, value in extents:
        upright = key == "height"
        low, high = (LOWEST_ROOM, HIGHEST_ROOM) if upright else (0.5, LARGEST_PLAN)
        if low <= value <= high:
            continue
        raise RoomError(
            f"{_as_written(value, room.units)} is no {key.partition(',')[0]} of a small room "
            f"({shown_length(low, room.units)} to {shown_length(high, room.units)})",
            where=f"[shape] {key}",
            cure=_unit_guess(value, room.units, low, high),
        )


def _as_written(value: float, units: str) -> str:
    return f"{value / METRES_PER[units]:g} {units}"


def _unit_guess(value: float, units: str, low: float, high: float) -> str:
    """What the number would be in another unit, when that would make sense."""
    if not 0 < value < inf:
        return "Write the inside dimension as a positive number."
    written = value / METRES_PER[units]
    for other, factor in METRES_PER.items():
        if other in ("m", "ft") and other != units and low <= written * factor <= high:
            name = {"m": "metres", "ft": "feet"}[other]
            return f'If {written:g} means {name}, write units = "{other}" at the top of the file.'
    usual = 2.6 if high == HIGHEST_ROOM else 4.0
    for other in sorted(
        ("cm", "mm", "in"), key=lambda u: abs(log(written * METRES_PER[u] / usual))
    ):
        if low <= written * METRES_PER[other] <= high:
            return f'If {written:g} means {other}, write "{written:g} {other}".'
    return "Check the number and the unit."


def _check_footprint(room: Room) -> None:
    if room.shape.footprint is None:
        return
    from shapely.geometry import Polygon
    from shapely.validation import explain_validity

    corners = room.footprint
    where = "[shape] footprint"
    if len(corners) < 3:
        raise RoomError(
            f"{len(corners)} corners enclose nothing", where=where, cure="Give 3 or more."
        )
    if len(corners) > 200:
        raise RoomError(f"{len(corners)} corners are too many", where=where, cure="Give up to 200.")
    steps = np.hypot(*(np.roll(corners, -1, axis=0) - corners).T)
    for number in np.flatnonzero(steps < 0.005):
        following = (number + 1) % len(corners) + 1
        raise RoomError(
            f"corners {number + 1} and {following} are the same point",
            where=where,
            cure="Leave one out; the last corner is joined to the first by itself.",
        )
    outline = Polygon(corners)
    if not outline.is_valid:
        raise RoomError(
            f"the outline crosses or touches itself ({explain_validity(outline)})",
            where=where,
            cure="List the corners in the order in which you walk along the walls.",
        )
    if not outline.exterior.is_ccw:
        turned = [[round(x / METRES_PER[room.units], 4) for x in c] for c in corners[::-1].tolist()]
        raise RoomError(
            "the corners run clockwise",
            where=where,
            cure=f"List them anticlockwise as seen from above: {turned} "
            "(and turn the list of wall materials with them).",
        )


def _check_wall_materials(room: Room) -> None:
    walls = room.surfaces.walls
    names = room.wall_names
    if isinstance(walls, dict):
        for name in walls:
            if name not in names:
                raise _no_such_surface(name, names, "[surfaces.walls]")
        missing = [name for name in names if name not in walls]
        if missing:
            raise RoomError(
                f"no material for {', '.join(missing)}",
                where="[surfaces.walls]",
                cure=f"Name a material for each of {', '.join(names)}.",
            )
    elif not isinstance(walls, str) and len(walls) != len(names):
        raise RoomError(
            f"{len(walls)} materials for {len(names)} walls",
            where="[surfaces] walls",
            cure="List one for each edge of the footprint, in its order, or name one for all.",
        )


def _check_names(room: Room) -> None:
    """Every surface that is mentioned exists."""
    limits = room.treatment
    mentioned: list[tuple[str, str]] = []
    mentioned += [(o.wall, f"[[opening]] {n}, wall") for n, o in enumerate(room.openings, 1)]
    mentioned += [(p.on, f"[[patch]] {n}, on") for n, p in enumerate(room.patches, 1)]
    mentioned += [(k.on, f"[[keep_out]] {n}, on") for n, k in enumerate(room.keep_outs, 1)]
    mentioned += [(name, "[treatment] keep_clear") for name in limits.keep_clear]
    mentioned += [(name, "[treatment] max_cover") for name in limits.max_cover]
    mentioned += [(name, "[treatment] max_weight_kg") for name in limits.max_weight_kg]
    mentioned += [(name, "[treatment] symmetric") for pair in limits.symmetric for name in pair]
    for name, where in mentioned:
        if name not in room.surface_names:
            raise _no_such_surface(name, room.surface_names, where)
    for one, other in limits.symmetric:
        if one == other:
            raise RoomError(
                f"{one!r} is paired with itself",
                where="[treatment] symmetric",
                cure='Name two surfaces, for example ["left", "right"].',
            )


def _no_such_surface(name: str, known: Iterable[str], where: str) -> RoomError:
    names = list(known)
    near = get_close_matches(name, names, n=1)
    hint = f"Did you mean {near[0]!r}? " if near else ""
    return RoomError(
        f"there is no surface {name!r}",
        where=where,
        cure=f"{hint}The surfaces: {', '.join(names)}.",
    )


def _box(left: float, bottom: float, width: float, height: float) -> Polygon:
    from shapely.geometry import box

    return box(left, bottom, left + width, bottom + height)


def _leaves(shape: Polygon, frame: Frame) -> bool:
    from shapely.geometry import Polygon

    return not Polygon(frame.outline).buffer(TOLERANCE).covers(shape)


def _check_openings(room: Room, shape: Geometry) -> None:
    boxes = [_box(o.left, o.bottom, o.width, o.height) for o in room.openings]
    for number, (opening, box) in enumerate(zip(room.openings, boxes, strict=True), 1):
        frame = shape.frames[opening.wall]
        if _leaves(box, frame):
            raise RoomError(
                f"the {opening.kind} ({_extent(opening.left, opening.width, room.units)} across, "
                f"{_extent(opening.bottom, opening.height, room.units)} up) leaves the surface "
                f"{opening.wall!r}, which is {shown_length(frame.width, room.units)} wide and "
                f"{shown_length(frame.height, room.units)} high",
                where=f"[[opening]] {number}",
                cure="Measure left from the wall's left end as seen from inside, bottom from the "
                "floor.",
            )
    for (one, first), (two, second) in combinations(enumerate(room.openings, 1), 2):
        overlap = boxes[one - 1].intersection(boxes[two - 1]).area
        if first.wall == second.wall and overlap > 1e-4:
            raise RoomError(
                f"the {second.kind} overlaps the {first.kind} of [[opening]] {one} by "
                f"{overlap:.2f} m²",
                where=f"[[opening]] {two}",
                cure="Move one, or make it smaller.",
            )


def _extent(start: float, size: float, units: str) -> str:
    return f"{shown_length(start, units)} to {shown_length(start + size, units)}"


def _check_covers(room: Room, shape: Geometry) -> None:
    """Patches fit on what openings leave, and rectangles lie on their surface."""
    free = dict(shape.areas)
    for opening in room.openings:
        free[opening.wall] -= opening.area
    rectangles: list[tuple[str, KeepOut | Patch]]
    rectangles = [(f"[[keep_out]] {n}", k) for n, k in enumerate(room.keep_outs, 1)]
    rectangles += [(f"[[patch]] {n}", p) for n, p in enumerate(room.patches, 1) if p.area is None]
    for where, thing in rectangles:
        sides = (thing.left or 0.0, thing.bottom or 0.0, thing.width or 0.0, thing.height or 0.0)
        box = _box(*sides)
        if _leaves(box, shape.frames[thing.on]):
            raise RoomError(
                f"the rectangle leaves the surface {thing.on!r}",
                where=where,
                cure="Check left, bottom, width and height.",
            )
    for number, patch in enumerate(room.patches, 1):
        if patch.covered > free[patch.on] + 1e-6:
            raise RoomError(
                f"{patch.covered:.2f} m² of {patch.material!r} do not fit on {patch.on!r}, which has "
                f"{max(free[patch.on], 0.0):.2f} m² left",
                where=f"[[patch]] {number}, area",
                cure=f"Make it {max(free[patch.on], 0.0):.2f} m² or less.",
            )
        free[patch.on] -= patch.covered


def _check_positions(room: Room) -> None:
    from shapely.geometry import Point, Polygon

    outline = Polygon(room.footprint).buffer(TOLERANCE)
    places = room.positions
    points = [("seat", places.seat)] if places.seat is not None else []
    points += [(f"loudspeakers, {n}", p) for n, p in enumerate(places.loudspeakers, 1)]
    points += [(f"sources, {name}", p) for name, p in places.sources.items()]
    points += [(f"microphones, {name}", p) for name, p in places.microphones.items()]
    for key, (x, y, z) in points:
        if not outline.covers(Point(x, y)) or not 0.0 <= z <= room.height:
            shown = ", ".join(shown_length(v, room.units) for v in (x, y, z))
            raise RoomError(
                f"({shown}) lies outside the room",
                where=f"[positions] {key}",
                cure="x runs from the front wall to the back, y from left to right, z up.",
            )
