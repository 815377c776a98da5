"""How many equal panels fit on a surface, laid in rows or in columns.

The best set of rows is found exactly, by dynamic programming over the heights at which a row may
begin: pushed down until it meets the row below it or the top of an obstacle, a row never loses a
panel, so no other heights are needed. (Where an edge is slanted that is not so, and heights in steps
of 25 mm are tried as well.) Rows may be of upright and of turned panels, mixed. Patterns that are
neither rows nor columns are not searched; fitters do not hang panels like that.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product as pairs

from planner.treat.free_field import TOUCH, Box, Field

STEP = 0.025
"""Steps of the heights tried beside slanted edges. [m]"""

MOST_LEVELS = 1500
"""Heights from which no further ones are derived: with that many the best is as good as found."""

Size = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Row:
    """A row of equal panels, sizes with half a gap on every side."""

    bottom: float
    """[m]"""
    size: Size
    """Width and height of one. [m]"""
    stretches: tuple[tuple[float, float, int], ...]
    """From, to, and how many fit between. [m], [m], [-]"""

    @property
    def count(self) -> int:
        """Panels that fit."""
        return sum(count for _, _, count in self.stretches)

    def boxes(self) -> list[Box]:
        """The panels, pushed to the left of their stretch."""
        width, height = self.size
        return [
            Box(left + number * width, self.bottom, width, height)
            for left, _, count in self.stretches
            for number in range(count)
        ]


def fitting(length: float, width: float) -> int:
    """How many panels go side by side on a length."""
    return int((length + TOUCH) / width)


def row_at(field: Field, bottom: float, size: Size) -> Row:
    """The row of one size that begins at a height."""
    width, height = size
    found = [
        (left, right, fitting(right - left, width)) for left, right in field.free(bottom, height)
    ]
    return Row(bottom, size, tuple(entry for entry in found if entry[2]))


def best_rows(field: Field, sizes: Sequence[Size]) -> list[Row]:
    """Rows that hold the most panels, lowest first.

    Parameters
    ----------
    field
        Where.
    sizes
        Sizes a panel may have (upright, turned), with half a gap on every side. [m]
    """
    levels = _levels(field, sizes)
    most = [0] * (len(levels) + 1)
    taken: list[tuple[Row, int] | None] = [None] * len(levels)
    for number in range(len(levels) - 1, -1, -1):
        most[number] = most[number + 1]
        for size in sizes:
            row = row_at(field, levels[number], size)
            if not row.count:
                continue
            following = bisect_left(levels, levels[number] + size[1] - TOUCH)
            if row.count + most[following] > most[number]:
                most[number] = row.count + most[following]
                taken[number] = (row, following)
    rows, number = [], 0
    while number < len(levels):
        choice = taken[number]
        if choice is None:
            number += 1
        else:
            rows.append(choice[0])
            number = choice[1]
    return rows


def _levels(field: Field, sizes: Sequence[Size]) -> list[float]:
    """Heights at which a row may begin."""
    starts = list(field.starts)
    if field.is_slanted:
        steps = int((field.high - field.low) / STEP)
        starts += [field.low + STEP * number for number in range(steps + 1)]
    least = min(height for _, height in sizes)
    known: set[float] = set()
    waiting = starts
    while waiting and len(known) < MOST_LEVELS:
        fresh = {round(level, 6) for level in waiting} - known
        known |= fresh
        waiting = [
            level + height
            for level, (_, height) in pairs(sorted(fresh), sizes)
            if level + height + least <= field.high + TOUCH
        ]
    return sorted(level for level in known if level >= field.low - TOUCH)


def densest(field: Field, sizes: Sequence[Size]) -> list[Box]:
    """Panels that hold the most, in rows or in columns, pushed to one side. [m].

    Rows are taken where columns hold no more.
    """
    rows = [box for row in best_rows(field, sizes) for box in row.boxes()]
    if _could_hold(field, sizes) <= len(rows):
        return rows
    turned = [(height, width) for width, height in sizes]
    columns = [
        box.turned() for column in best_rows(field.turned(), turned) for box in column.boxes()
    ]
    return columns if len(columns) > len(rows) else rows


def _could_hold(field: Field, sizes: Sequence[Size]) -> int:
    """No more than this can fit, by area alone."""
    width, height = sizes[0]
    across, up = field.width - field.gap, field.height - field.gap
    return int((max(across, 0.0) * max(up, 0.0) + TOUCH) / (width * height))
