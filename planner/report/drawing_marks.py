"""What a drawing is made of: marks in metres on layers, and texts whose size is that on paper."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

Point = tuple[float, float]

DIGIT_WIDTH = 0.58
"""Width of a digit of the shipped typeface over its size, and a safe mean of other text. [-]"""


@dataclass(frozen=True, slots=True)
class Line:
    """A straight line."""

    start: Point
    """[m]"""
    end: Point
    """[m]"""
    layer: str


@dataclass(frozen=True, slots=True)
class Outline:
    """A closed polygon."""

    points: tuple[Point, ...]
    """[m]"""
    layer: str
    name: str = ""
    """What it is, for example a panel's number."""


@dataclass(frozen=True, slots=True)
class Circle:
    """A circle."""

    centre: Point
    """[m]"""
    radius: float
    """[m]"""
    layer: str


@dataclass(frozen=True, slots=True)
class Label:
    """A line of text."""

    at: Point
    """[m]"""
    text: str
    size: float
    """Height of the type on paper. [mm]"""
    anchor: str = "middle"
    """``start``, ``middle`` or ``end``."""
    angle: float = 0.0
    """Anticlockwise. [°]"""
    layer: str = "text"

    @property
    def width(self) -> float:
        """Length on paper, estimated. [mm]."""
        return DIGIT_WIDTH * self.size * len(self.text) * (1.08 if self.layer == "heading" else 1.0)


Mark = Line | Outline | Circle | Label


@dataclass(frozen=True, slots=True)
class Drawing:
    """One view of the room, to scale."""

    title: str
    surface: str
    """``plan``, or the name of the surface that is seen."""
    datum: str
    """Where its dimensions are measured from, in words."""
    scale: float
    """So many millimetres of the room are one millimetre of paper. [-]"""
    units: str
    """``m`` (dimensions in millimetres) or ``ft`` (feet and inches)."""
    marks: tuple[Mark, ...]
    description: str = ""
    notes: tuple[str, ...] = field(default=())

    def metres(self, paper_mm: float) -> float:
        """Length in the room of a length on paper. [m]."""
        return paper_mm * self.scale / 1000.0

    def paper(self, metres: float) -> float:
        """Length on paper of a length in the room. [mm]."""
        return metres * 1000.0 / self.scale

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """Left, bottom, right and top of everything drawn. [m]."""
        boxes = [_box(mark, self.scale) for mark in self.marks]
        left, bottom, right, top = zip(*boxes, strict=True)
        return min(left), min(bottom), max(right), max(top)

    @property
    def paper_size(self) -> tuple[float, float]:
        """Width and height on paper. [mm]."""
        left, bottom, right, top = self.bounds
        return self.paper(right - left), self.paper(top - bottom)

    def with_marks(self, marks: Sequence[Mark]) -> Drawing:
        """The drawing with more marks on top."""
        return replace(self, marks=(*self.marks, *marks))


def rectangle(
    left: float, bottom: float, width: float, height: float, layer: str, name: str = ""
) -> Outline:
    """A rectangle as an outline."""
    right, top = left + width, bottom + height
    return Outline(((left, bottom), (right, bottom), (right, top), (left, top)), layer, name)


def hatching(left: float, bottom: float, width: float, height: float, step: float) -> list[Line]:
    """Lines at 45° over a rectangle, `step` apart along its sides. [m]."""
    lines = []
    offset = step
    while offset < width + height:
        start = (left + max(0.0, offset - height), bottom + min(offset, height))
        end = (left + min(offset, width), bottom + max(0.0, offset - width))
        lines.append(Line(start, end, "hatching"))
        offset += step
    return lines


def _box(mark: Mark, scale: float) -> tuple[float, float, float, float]:
    match mark:
        case Line(start, end, _):
            points: Sequence[Point] = (start, end)
        case Outline(corners, _, _):
            points = corners
        case Circle((x, y), radius, _):
            points = ((x - radius, y - radius), (x + radius, y + radius))
        case Label():
            points = label_corners(mark, scale)
    xs, ys = zip(*points, strict=True)
    return min(xs), min(ys), max(xs), max(ys)


def label_corners(label: Label, scale: float) -> tuple[Point, Point]:
    """Opposite corners of the box a text takes; texts run along the axes or are small. [m]."""
    length, height = (value * scale / 1000.0 for value in (label.width, label.size))
    before = {"start": 0.0, "middle": 0.5, "end": 1.0}[label.anchor] * length
    x, y = label.at
    if abs(label.angle) == 90.0:
        low = y - before if label.angle > 0 else y - (length - before)
        return (x - height / 2, low), (x + height / 2, low + length)
    return (x - before, y - height / 2), (x - before + length, y + height / 2)
