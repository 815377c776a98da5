"""Dimensions on drawings: running measures from a datum, overall lengths, the scale bar."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import pairwise

from planner.report.drawing_marks import DIGIT_WIDTH, Label, Line, Mark, rectangle
from planner.room.lengths import METRES_PER, feet_and_inches

TEXT = 2.2
"""Type of a dimension. [mm on paper]"""
PITCH = 2.9
"""Least distance between two dimension texts. [mm on paper]"""
GAP, JOG, REACH = 0.8, 2.2, 5.0
"""Extension lines: distance from the outline, where they bend, where the text begins. [mm]"""


def dimension_text(length: float, units: str) -> str:
    """A length as drawn: whole millimetres, or feet and inches to an eighth."""
    return feet_and_inches(length) if units == "ft" else f"{round(length * 1000)}"


def distinct(values: Iterable[float], tolerance: float = 0.0005) -> list[float]:
    """Sorted values, those nearer than the tolerance given once. [m]."""
    kept: list[float] = []
    for value in sorted(values):
        if not kept or value - kept[-1] > tolerance:
            kept.append(value)
    return kept


def spread(places: Sequence[float], pitch: float) -> list[float]:
    """Places moved as little as possible so that they stand at least `pitch` apart.

    Ascending places less their rank times the pitch must not fall; the nearest such sequence in
    the least-squares sense is found by pooling neighbours that would cross.
    """
    blocks: list[tuple[float, int]] = []
    for rank, place in enumerate(places):
        mean, size = place - rank * pitch, 1
        while blocks and blocks[-1][0] > mean:
            other, count = blocks.pop()
            mean = (mean * size + other * count) / (size + count)
            size += count
        blocks.append((mean, size))
    flat = [mean for mean, size in blocks for _ in range(size)]
    return [mean + rank * pitch for rank, mean in enumerate(flat)]


def running_along(
    values: Sequence[float], base: float, scale: float, units: str
) -> tuple[list[Mark], float]:
    """Measures from the left, below the line v = `base`, and how deep they reach. [m], [m]."""
    per_mm = scale / 1000.0
    marks: list[Mark] = []
    for value, place in zip(values, spread(values, PITCH * per_mm), strict=True):
        ends = [(value, GAP), (value, JOG), (place, REACH - 0.6)]
        points = [(x, base - depth * per_mm) for x, depth in ends]
        marks += [Line(a, b, "dimension") for a, b in pairwise(points)]
        at = (place, base - REACH * per_mm)
        text = dimension_text(value, units)
        marks.append(Label(at, text, TEXT, "end", 90.0, "dimension"))
    return marks, _depth(values, units) * per_mm


def running_up(
    values: Sequence[float], base: float, scale: float, units: str
) -> tuple[list[Mark], float]:
    """Measures from below, left of the line u = `base`, and how far they reach. [m], [m]."""
    per_mm = scale / 1000.0
    marks: list[Mark] = []
    for value, place in zip(values, spread(values, PITCH * per_mm), strict=True):
        ends = [(value, GAP), (value, JOG), (place, REACH - 0.6)]
        points = [(base - depth * per_mm, y) for y, depth in ends]
        marks += [Line(a, b, "dimension") for a, b in pairwise(points)]
        at = (base - REACH * per_mm, place)
        marks.append(Label(at, dimension_text(value, units), TEXT, "end", 0.0, "dimension"))
    return marks, _depth(values, units) * per_mm


def overall_along(start: float, end: float, y: float, scale: float, units: str) -> list[Mark]:
    """A length with end strokes, its text below the line."""
    per_mm = scale / 1000.0
    tick = 1.1 * per_mm
    marks: list[Mark] = [Line((start, y), (end, y), "dimension")]
    marks += [Line((x - tick, y - tick), (x + tick, y + tick), "dimension") for x in (start, end)]
    at = ((start + end) / 2, y - 2.0 * per_mm)
    marks.append(Label(at, dimension_text(end - start, units), TEXT, layer="dimension"))
    return marks


def overall_up(start: float, end: float, x: float, scale: float, units: str) -> list[Mark]:
    """A height with end strokes, its text left of the line."""
    per_mm = scale / 1000.0
    tick = 1.1 * per_mm
    marks: list[Mark] = [Line((x, start), (x, end), "dimension")]
    marks += [Line((x - tick, y - tick), (x + tick, y + tick), "dimension") for y in (start, end)]
    at = (x - 2.0 * per_mm, (start + end) / 2)
    marks.append(Label(at, dimension_text(end - start, units), TEXT, "middle", 90.0, "dimension"))
    return marks


def scale_bar(left: float, y: float, scale: float, units: str) -> list[Mark]:
    """Alternating blocks of a true length with their ends labelled, about 40 mm on paper."""
    unit = METRES_PER[units]
    wanted = 40.0 * scale / 1000.0 / unit
    length = max((n for n in (0.5, 1, 2, 5, 10, 20, 50) if n <= wanted), default=0.5)
    block, height = length * unit / 4, 1.6 * scale / 1000.0
    marks: list[Mark] = [
        rectangle(left + n * block, y, block, height, "scale-dark" if n % 2 == 0 else "scale-light")
        for n in range(4)
    ]
    marks.append(rectangle(left, y, 4 * block, height, "scale-bar", f"{length:g} {units}"))
    below = y - 2.0 * scale / 1000.0
    for n in (0, 2, 4):
        text = f"{length * n / 4:g}" + (f" {units}" if n == 4 else "")
        marks.append(Label((left + n * block, below), text, TEXT, layer="note"))
    return marks


def _depth(values: Sequence[float], units: str) -> float:
    longest = max((len(dimension_text(value, units)) for value in values), default=0)
    return REACH + longest * TEXT * DIGIT_WIDTH + 2.0
