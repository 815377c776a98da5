"""Plan, wall elevations and reflected ceiling plan of a room with its panels."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from planner.report.drawing_dimensions import (
    dimension_text,
    distinct,
    overall_along,
    overall_up,
    running_along,
    running_up,
    scale_bar,
)
from planner.report.drawing_marks import Drawing, Label, Mark, Outline, Point
from planner.report.drawing_parts import (
    PLAN,
    Panel,
    corner_letters,
    corner_name,
    front_mark,
    position_marks,
    position_measures,
    surface_marks,
    surface_title,
    wall_in_plan,
)
from planner.room.geometry import Frame, geometry
from planner.room.model import Room


def plan(
    room: Room,
    panels: Iterable[Panel] = (),
    *,
    scale: float = 50,
    units: str = "m",
    dimensions: bool = True,
) -> Drawing:
    """Plan of the room: walls, openings, panels in section, floor panels, seat, loudspeakers.

    Parameters
    ----------
    room
        The room.
    panels
        Panels on any surface; those on the ceiling are left to the reflected ceiling plan.
    scale
        Millimetres in the room per millimetre of paper. [-]
    units
        ``m`` or ``ft``.
    dimensions
        With dimensions, corner letters and scale bar.
    """
    shape = geometry(room)
    frame = shape.frames["floor"]
    marks: list[Mark] = []
    panels = list(panels)
    marks += surface_marks(room, frame, panels, scale, units)
    marks.append(Outline(_points(frame.outline), "room", "footprint"))
    corner = room.footprint.min(axis=0)
    for name in room.wall_names:
        marks += wall_in_plan(room, shape.frames[name], panels, corner, scale)
    marks += position_marks(room, corner, scale)
    along, up = position_measures(room, corner)
    marks += front_mark(frame, scale)
    if dimensions:
        marks += corner_letters(frame, scale)
        marks += _dimensioned(
            frame, [0.0, *along, frame.width], [0.0, *up, frame.height], scale, units
        )
    return _finished(PLAN, marks, frame, scale, units, _plan_datum(room), dimensions, room)


def ceiling_plan(
    room: Room,
    panels: Iterable[Panel] = (),
    *,
    scale: float = 50,
    units: str = "m",
    dimensions: bool = True,
) -> Drawing:
    """The ceiling as a mirror on the floor would show it, so that it lies over the plan."""
    shape = geometry(room)
    frame = shape.frames["ceiling"]
    panels = [panel for panel in panels if panel.surface == "ceiling"]
    corner = room.footprint.min(axis=0)
    marks: list[Mark] = [Outline(_points(frame.outline), "room", "ceiling")]
    marks += position_marks(room, corner, scale, layer="below")
    marks += surface_marks(room, frame, panels, scale, units)
    marks += front_mark(frame, scale)
    if dimensions:
        marks += corner_letters(frame, scale)
        marks += _dimensioned(frame, *_edges(room, frame, panels), scale, units)
    return _finished("ceiling", marks, frame, scale, units, _plan_datum(room), dimensions, room)


def elevation(
    room: Room,
    wall: str,
    panels: Iterable[Panel] = (),
    *,
    scale: float = 50,
    units: str = "m",
    dimensions: bool = True,
) -> Drawing:
    """One wall as seen from inside, measured from its left corner and the finished floor.

    Raises
    ------
    KeyError
        The room has no wall of that name.
    """
    frame = geometry(room).frames[wall]
    panels = [panel for panel in panels if panel.surface == wall]
    marks: list[Mark] = [Outline(_points(frame.outline), "room", wall)]
    marks += surface_marks(room, frame, panels, scale, units)
    number = room.wall_names.index(wall)
    count = len(room.footprint)
    left, right = corner_name((number + 1) % count), corner_name(number)
    if dimensions:
        drop = 3.0 * scale / 1000.0
        marks += [
            Label((-drop, -drop), left, 3.0, layer="heading"),
            Label((frame.width + drop, -drop), right, 3.0, layer="heading"),
        ]
        marks += _dimensioned(frame, *_edges(room, frame, panels), scale, units)
    datum = f"measured from corner {left} (left) and from the finished floor"
    return _finished(wall, marks, frame, scale, units, datum, dimensions, room)


def view(
    room: Room,
    name: str,
    panels: Iterable[Panel] = (),
    *,
    scale: float = 50,
    units: str = "m",
    dimensions: bool = True,
) -> Drawing:
    """The plan, the ceiling or a wall by its name."""
    if name in (PLAN, "floor"):
        return plan(room, panels, scale=scale, units=units, dimensions=dimensions)
    if name == "ceiling":
        return ceiling_plan(room, panels, scale=scale, units=units, dimensions=dimensions)
    return elevation(room, name, panels, scale=scale, units=units, dimensions=dimensions)


def _points(outline: NDArray[np.float64]) -> tuple[Point, ...]:
    return tuple((float(u), float(v)) for u, v in outline)


def _edges(room: Room, frame: Frame, panels: Sequence[Panel]) -> tuple[list[float], list[float]]:
    """Where panels and openings begin and end along u and v, with the surface's own ends."""
    boxes = [(p.left, p.bottom, p.width, p.height) for p in panels]
    boxes += [(o.left, o.bottom, o.width, o.height) for o in room.openings if o.wall == frame.name]
    along = [0.0, frame.width, *(b[0] for b in boxes), *(b[0] + b[2] for b in boxes)]
    up = [0.0, frame.height, *(b[1] for b in boxes), *(b[1] + b[3] for b in boxes)]
    return along, up


def _dimensioned(
    frame: Frame, along: Sequence[float], up: Sequence[float], scale: float, units: str
) -> list[Mark]:
    marks_along, deep = running_along(distinct(along), 0.0, scale, units)
    marks_up, far = running_up(distinct(up), 0.0, scale, units)
    return [
        *marks_along,
        *marks_up,
        *overall_along(0.0, frame.width, -deep, scale, units),
        *overall_up(0.0, frame.height, -far, scale, units),
    ]


def _plan_datum(room: Room) -> str:
    """The corner that x and y are measured from."""
    footprint = room.footprint
    low = footprint.min(axis=0)
    at = np.flatnonzero(np.hypot(*(footprint - low).T) < 1e-6)
    if at.size:
        return f"measured from corner {corner_name(int(at[0]))}"
    left = corner_name(int(np.argmin(footprint[:, 0])))
    lower = corner_name(int(np.argmin(footprint[:, 1])))
    return f"measured across from corner {left} and up from corner {lower}"


def _finished(
    name: str,
    marks: list[Mark],
    frame: Frame,
    scale: float,
    units: str,
    datum: str,
    dimensions: bool,
    room: Room,
) -> Drawing:
    title = surface_title(name)
    panels = sum(isinstance(m, Outline) and m.layer == "panel" for m in marks)
    size = " × ".join(dimension_text(value, units) for value in (frame.width, frame.height))
    unit = "" if units == "ft" else " mm"
    many = "no panels" if panels == 0 else f"{panels} panel{'s' if panels > 1 else ''}"
    description = f"{title} of {room.name}, {size}{unit}, with {many}; {datum}."
    drawing = Drawing(title, name, datum, scale, units, tuple(marks), description)
    if not dimensions:
        return drawing
    per_mm = scale / 1000.0
    left, bottom, _, top = drawing.bounds
    how = "feet and inches" if units == "ft" else "millimetres"
    head: list[Mark] = [
        Label((left, top + 9.5 * per_mm), title, 4.0, "start", layer="heading"),
        Label(
            (left, top + 4.5 * per_mm),
            f"Scale 1:{scale:g}, dimensions in {how}, {datum}",
            2.4,
            "start",
            layer="note",
        ),
    ]
    return drawing.with_marks(
        [*head, *scale_bar(left + 1.5 * per_mm, bottom - 5.0 * per_mm, scale, units)]
    )
