"""What views of a room are put together from: openings, keep-outs, panels, positions, letters."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import atan2, degrees

import numpy as np
from numpy.typing import NDArray

from planner.report.chart import shortened
from planner.report.drawing_dimensions import dimension_text
from planner.report.drawing_marks import (
    Circle,
    Label,
    Line,
    Mark,
    Outline,
    Point,
    hatching,
    rectangle,
)
from planner.room.geometry import Frame
from planner.room.model import Room

PLAN = "plan"
USUAL_DEPTH_MM = 50.0
"""Depth of a panel in plan where its product does not say. [mm]"""
DIGIT = 0.6
"""Width of a character over its size, on the safe side. [-]"""


@dataclass(frozen=True, slots=True)
class Panel:
    """A panel in its place; `left` and `bottom` from the surface's named corner."""

    number: str
    """As on the shopping list."""
    surface: str
    left: float
    """[m]"""
    bottom: float
    """[m]"""
    width: float
    """[m]"""
    height: float
    """[m]"""
    label: str = ""
    """What it is."""
    thickness_mm: float | None = None
    """[mm]"""
    gap_mm: float | None = None
    """Air behind it. [mm]"""
    product: str = ""
    """Its id in the catalogue."""

    @property
    def depth(self) -> float:
        """Thickness and gap. [m]."""
        return ((self.thickness_mm or USUAL_DEPTH_MM) + (self.gap_mm or 0.0)) / 1000.0


def corner_name(number: int) -> str:
    """Letter of a corner of the footprint: A, B, … Z, then A2, B2 and so on."""
    turn, letter = divmod(number, 26)
    return chr(ord("A") + letter) + (str(turn + 1) if turn else "")


def surface_title(name: str) -> str:
    """Name of a view, for people."""
    titles = {
        PLAN: "Plan",
        "floor": "Floor",
        "ceiling": "Reflected ceiling plan",
    }
    return titles.get(name) or (f"{name} wall" if "wall" not in name else name).capitalize()


def surface_marks(
    room: Room, frame: Frame, panels: Sequence[Panel], scale: float, units: str
) -> list[Mark]:
    """Openings, patches, keep-outs and panels of one surface, in (u, v)."""
    marks: list[Mark] = []
    for patch in room.patches:
        if patch.on == frame.name and patch.left is not None and patch.bottom is not None:
            assert patch.width is not None
            assert patch.height is not None
            box = (patch.left, patch.bottom, patch.width, patch.height)
            marks.append(rectangle(*box, "patch", patch.material))
            marks += _boxed_text(box, (patch.material,), scale)
    for opening in room.openings:
        if opening.wall == frame.name:
            box = (opening.left, opening.bottom, opening.width, opening.height)
            marks.append(rectangle(*box, "opening", opening.kind))
            marks += _boxed_text(box, (opening.kind,), scale)
    for keep_out in room.keep_outs:
        if keep_out.on == frame.name:
            box = (keep_out.left, keep_out.bottom, keep_out.width, keep_out.height)
            marks += hatching(*box, 2.5 * scale / 1000.0)
            marks.append(rectangle(*box, "keep-out", keep_out.why or "keep clear"))
            marks += _boxed_text(box, (keep_out.why or "keep clear",), scale, layer="plated")
    for panel in panels:
        if panel.surface != frame.name:
            continue
        box = (panel.left, panel.bottom, panel.width, panel.height)
        marks.append(rectangle(*box, "panel", panel.number))
        size = " × ".join(dimension_text(length, units) for length in box[2:])
        marks += _boxed_text(box, (panel.number, size), scale, layer="number")
    return marks


def _boxed_text(
    box: tuple[float, float, float, float],
    lines: Sequence[str],
    scale: float,
    layer: str = "note",
) -> list[Mark]:
    """Lines of text in the middle of a rectangle, as large and as many as it holds."""
    left, bottom, width, height = box
    room_along, room_up = width * 1000 / scale - 1.0, height * 1000 / scale - 0.6
    upright = room_up > 1.3 * room_along and DIGIT * 2.4 * len(lines[0]) > room_along
    if upright:
        room_along, room_up = room_up, room_along
    shown: list[tuple[str, float, str]] = []
    used = 0.0
    for number, text in enumerate(lines):
        whole = _fits(text, room_along, 1.5)
        text, size = _fitting(text, room_along, 3.0 if layer == "number" and number == 0 else 2.2)
        if number > 0 and not whole:
            continue
        if text and used + 1.25 * size <= room_up:
            shown.append((text, size, layer if number == 0 else "note"))
            used += 1.25 * size
        elif number == 0:
            break
    marks: list[Mark] = []
    middle, offset = (left + width / 2, bottom + height / 2), used / 2
    for text, size, on in shown:
        shift = (offset - 0.625 * size) * scale / 1000.0
        at = (middle[0] - shift, middle[1]) if upright else (middle[0], middle[1] + shift)
        marks.append(Label(at, text, size, "middle", 90.0 if upright else 0.0, on))
        offset -= 1.25 * size
    return marks


def _fits(text: str, room: float, size: float) -> bool:
    return DIGIT * size * len(" ".join(text.split())) <= room


def _fitting(text: str, room: float, size: float) -> tuple[str, float]:
    """Text that fits into `room` millimetres: smaller type down to 1.5 mm, then shortened."""
    text = " ".join(text.split())
    for tried in (size, 0.8 * size, 1.8, 1.5):
        if tried <= size and _fits(text, room, tried):
            return text, tried
    most = int(room / (DIGIT * 1.8))
    return (shortened(text, most), 1.8) if most >= 3 else ("", 1.5)


def wall_in_plan(
    room: Room,
    frame: Frame,
    panels: Sequence[Panel],
    corner: NDArray[np.float64],
    scale: float,
) -> list[Mark]:
    """Openings and panels of one wall in section, and the wall's name inside the room."""
    start = frame.origin[:2] - corner
    along, inward = frame.right[:2], frame.normal[:2]

    def place(u: float, depth: float) -> Point:
        x, y = start + u * along + depth * inward
        return float(x), float(y)

    marks: list[Mark] = []
    deepest = 0.0
    thin = 0.6 * scale / 1000.0
    for opening in room.openings:
        if opening.wall == frame.name:
            ends = opening.left, opening.left + opening.width
            marks.append(Line(place(ends[0], 0.0), place(ends[1], 0.0), "break"))
            marks += [Line(place(ends[0], d), place(ends[1], d), "opening") for d in (-thin, thin)]
            marks += [Line(place(u, -thin), place(u, thin), "opening") for u in ends]
    for panel in panels:
        if panel.surface == frame.name:
            ends = panel.left, panel.left + panel.width
            gap = (panel.gap_mm or 0.0) / 1000.0
            corners = [
                (ends[0], gap),
                (ends[1], gap),
                (ends[1], panel.depth),
                (ends[0], panel.depth),
            ]
            marks.append(Outline(tuple(place(*c) for c in corners), "section", panel.number))
            deepest = max(deepest, panel.depth)
    angle = degrees(atan2(along[1], along[0]))
    upright = angle - 180.0 if angle > 90.5 else angle + 180.0 if angle < -89.5 else angle
    at = place(frame.width / 2, deepest + 3.0 * scale / 1000.0)
    if frame.width * 1000 / scale > 10.0:
        title = surface_title(frame.name).lower()
        marks.append(Label(at, title, 2.2, "middle", round(upright, 3), "note"))
    return marks


def position_marks(
    room: Room,
    corner: NDArray[np.float64],
    scale: float,
    layer: str = "position",
) -> list[Mark]:
    """Loudspeakers as squares, the seat as a circle, in plan."""
    per_mm = scale / 1000.0
    marks: list[Mark] = []
    for number, place in enumerate(room.positions.loudspeakers, 1):
        x, y = float(place[0] - corner[0]), float(place[1] - corner[1])
        side = 3.2 * per_mm
        marks.append(
            rectangle(x - side / 2, y - side / 2, side, side, layer, f"loudspeaker {number}")
        )
        marks.append(Label((x, y + 3.4 * per_mm), f"L{number}", 2.2, layer="note"))
    if room.positions.seat is not None:
        place = room.positions.seat
        x, y = float(place[0] - corner[0]), float(place[1] - corner[1])
        marks.append(Circle((x, y), 1.9 * per_mm, layer))
        marks.append(Label((x, y + 3.6 * per_mm), "seat", 2.2, layer="note"))
    return marks


def position_measures(
    room: Room,
    corner: NDArray[np.float64],
) -> tuple[list[float], list[float]]:
    """Distances of seat and loudspeakers from the corner, along x and y. [m]."""
    places = [*room.positions.loudspeakers]
    if room.positions.seat is not None:
        places.append(room.positions.seat)
    return (
        [float(place[0] - corner[0]) for place in places],
        [float(place[1] - corner[1]) for place in places],
    )


def corner_letters(frame: Frame, scale: float) -> list[Mark]:
    """Letters outside the corners of the footprint, on the line that halves each corner."""
    outline = frame.outline
    marks: list[Mark] = []
    for number, point in enumerate(outline):
        before = point - outline[number - 1]
        after = outline[(number + 1) % len(outline)] - point
        outward = before / np.hypot(*before) - after / np.hypot(*after)
        turn = before[0] * after[1] - before[1] * after[0]
        length = np.hypot(*outward)
        outward = outward / length if length > 1e-6 else np.array([after[1], -after[0]])
        at = point + np.sign(turn or 1.0) * outward * 4.2 * scale / 1000.0
        place = (float(at[0]), float(at[1]))
        marks.append(Label(place, corner_name(number), 3.0, layer="heading"))
    return marks


def front_mark(frame: Frame, scale: float) -> list[Mark]:
    """An arrow towards x = 0, above the top edge."""
    per_mm = scale / 1000.0
    y = frame.height + 6.0 * per_mm
    middle = frame.width / 2
    tip = middle - 11.0 * per_mm
    arrow = (
        (tip, y),
        (tip + 3.0 * per_mm, y + 1.3 * per_mm),
        (tip + 3.0 * per_mm, y - 1.3 * per_mm),
    )
    return [
        Outline(arrow, "front", "front"),
        Line((tip + 3.0 * per_mm, y), (middle - 4.0 * per_mm, y), "front"),
        Label((middle - 2.0 * per_mm, y), "front", 2.6, "start", layer="note"),
    ]
