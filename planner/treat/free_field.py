"""The part of a surface on which panels may lie, as strips: which stretches of a row are free.

Coordinates are those of the surface, (u, v) from its named lower left corner. The gap that fitters
need between panels and to every edge is handled once, here: edges and obstacles grow by half of it,
and so does each panel (`Field.grown`), after which things may touch.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field, replace
from itertools import pairwise
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

if TYPE_CHECKING:
    from planner.room.geometry import Frame

TOUCH = 1e-6
"""Overlap by less than this is touching. [m]"""


class Box(NamedTuple):
    """A rectangle on a surface. [m]."""

    left: float
    bottom: float
    width: float
    height: float

    @property
    def right(self) -> float:
        """[m]."""
        return self.left + self.width

    @property
    def top(self) -> float:
        """[m]."""
        return self.bottom + self.height

    def grown(self, by: float) -> Box:
        """Larger by `by` on every side, smaller where that is negative."""
        return Box(self.left - by, self.bottom - by, self.width + 2 * by, self.height + 2 * by)

    def turned(self) -> Box:
        """With the two axes exchanged."""
        return Box(self.bottom, self.left, self.height, self.width)

    def mirrored(self, width: float) -> Box:
        """Mirrored about the middle of a surface that is `width` wide."""
        return Box(width - self.right, self.bottom, self.width, self.height)

    def shared(self, other: Box) -> float:
        """Area that both have. [m²]."""
        across = min(self.right, other.right) - max(self.left, other.left)
        up = min(self.top, other.top) - max(self.bottom, other.bottom)
        return max(across, 0.0) * max(up, 0.0)


class Block(NamedTuple):
    """A trapezium with level ends that nothing may overlap. [m]."""

    bottom: float
    top: float
    left_below: float
    left_above: float
    right_below: float
    right_above: float

    def reach(self, low: float, high: float) -> tuple[float, float] | None:
        """From where to where it reaches across a strip; None when it does not reach into it."""
        low, high = max(low, self.bottom), min(high, self.top)
        if high - low <= TOUCH:
            return None
        tall = self.top - self.bottom
        one, other = (low - self.bottom) / tall, (high - self.bottom) / tall
        slope_left = self.left_above - self.left_below
        slope_right = self.right_above - self.right_below
        return (
            self.left_below + slope_left * (one if slope_left > 0 else other),
            self.right_below + slope_right * (other if slope_right > 0 else one),
        )

    def mirrored(self, width: float) -> Block:
        """Mirrored about the middle of a surface that is `width` wide."""
        return Block(
            self.bottom,
            self.top,
            width - self.right_below,
            width - self.right_above,
            width - self.left_below,
            width - self.left_above,
        )


def block_of(box: Box) -> Block:
    """A rectangle as a block."""
    return Block(box.bottom, box.top, box.left, box.left, box.right, box.right)


@dataclass(frozen=True)
class Field:
    """A surface with its obstacles, already grown by half a gap."""

    width: float
    """Extent along u. [m]"""
    height: float
    """Extent along v. [m]"""
    gap: float
    """[m]"""
    blocks: tuple[Block, ...]
    """Obstacles as rows see them."""
    side_blocks: tuple[Block, ...]
    """The same with exchanged axes, as columns see them."""
    _known: dict[tuple[float, float], list[tuple[float, float]]] = field(
        default_factory=dict, repr=False, compare=False
    )

    @property
    def low(self) -> float:
        """Lowest bottom of a grown panel. [m]."""
        return 0.5 * self.gap

    @property
    def high(self) -> float:
        """Highest top of a grown panel. [m]."""
        return self.height - 0.5 * self.gap

    def grown(self, width: float, height: float) -> tuple[float, float]:
        """Size of a panel with half a gap on every side. [m]."""
        return width + self.gap, height + self.gap

    def free(self, bottom: float, height: float) -> list[tuple[float, float]]:
        """Stretches along u that are free over a whole strip; empty when it leaves the surface."""
        if bottom < self.low - TOUCH or bottom + height > self.high + TOUCH:
            return []
        key = (round(bottom, 6), round(height, 6))
        if key not in self._known:
            self._known[key] = self._free(bottom, bottom + height)
        return self._known[key]

    def _free(self, low: float, high: float) -> list[tuple[float, float]]:
        reaches = (block.reach(low, high) for block in self.blocks)
        taken = sorted(reach for reach in reaches if reach and reach[1] - reach[0] > TOUCH)
        stretches, start = [], 0.5 * self.gap
        for left, right in taken:
            if left - start > TOUCH:
                stretches.append((start, left))
            start = max(start, right)
        end = self.width - 0.5 * self.gap
        if end - start > TOUCH:
            stretches.append((start, end))
        return [(left, min(right, end)) for left, right in stretches if left < end]

    def holds(self, box: Box) -> bool:
        """Is a grown panel free of every obstacle and inside."""
        return any(
            left - TOUCH <= box.left and box.right <= right + TOUCH
            for left, right in self.free(box.bottom, box.height)
        )

    @property
    def starts(self) -> list[float]:
        """Heights at which a row can begin to be free: the lower edge and the top of obstacles."""
        return sorted({self.low, *(b.top for b in self.blocks if b.top < self.high)})

    @property
    def ends(self) -> list[float]:
        """Heights at which a row must end: the upper edge and the bottom of obstacles."""
        return sorted({self.high, *(b.bottom for b in self.blocks if b.bottom > self.low)})

    @property
    def is_slanted(self) -> bool:
        """Has an obstacle whose sides are not upright: the best row may then begin anywhere."""
        return any(
            abs(b.left_below - b.left_above) > TOUCH or abs(b.right_below - b.right_above) > TOUCH
            for b in self.blocks
        )

    def without(self, boxes: Iterable[Box]) -> Field:
        """The field with rectangles taken out of it (grown panels, or anything)."""
        taken = list(boxes)
        return replace(
            self,
            blocks=(*self.blocks, *(block_of(box) for box in taken)),
            side_blocks=(*self.side_blocks, *(block_of(box.turned()) for box in taken)),
            _known={},
        )

    def turned(self) -> Field:
        """With exchanged axes: its rows are this one's columns."""
        return Field(self.height, self.width, self.gap, self.side_blocks, self.blocks)

    def mirrored(self) -> Field:
        """Mirrored about the upright middle line."""
        turn = tuple(
            Block(
                self.width - b.top,
                self.width - b.bottom,
                b.left_above,
                b.left_below,
                b.right_above,
                b.right_below,
            )
            for b in self.side_blocks
        )
        blocks = tuple(b.mirrored(self.width) for b in self.blocks)
        return Field(self.width, self.height, self.gap, blocks, turn)

    def both(self, other: Field) -> Field:
        """What is free on this surface and on another of the same size."""
        return replace(
            self,
            blocks=tuple(dict.fromkeys((*self.blocks, *other.blocks))),
            side_blocks=tuple(dict.fromkeys((*self.side_blocks, *other.side_blocks))),
            _known={},
        )


def field_of(frame: Frame, obstacles: Iterable[Box], gap: float) -> Field:
    """The field of a surface.

    Parameters
    ----------
    frame
        Of the surface; its outline may be any simple polygon.
    obstacles
        Rectangles that must stay clear, in (u, v), not grown. [m]
    gap
        Least distance between panels, and from a panel to anything else. [m]
    """
    grown = [box.grown(0.5 * gap) for box in obstacles]
    rows = [block_of(box) for box in grown]
    columns = [block_of(box.turned()) for box in grown]
    if not _is_rectangle(frame):
        outline = [(float(u), float(v)) for u, v in frame.outline]
        rows += _outside(outline, frame.width, frame.height, gap)
        turned = [(v, u) for u, v in outline]
        columns += _outside(turned, frame.height, frame.width, gap)
    return Field(frame.width, frame.height, gap, tuple(rows), tuple(columns))


def _is_rectangle(frame: Frame) -> bool:
    if len(frame.outline) != 4:
        return False
    u, v = np.asarray(frame.outline).T
    at_edges = (np.minimum(u, frame.width - u) < TOUCH) & (np.minimum(v, frame.height - v) < TOUCH)
    return bool(at_edges.all())


def _outside(
    outline: list[tuple[float, float]], width: float, height: float, gap: float
) -> list[Block]:
    """What lies between an outline, drawn in by half a gap, and its bounding box, as trapezia."""
    from shapely.geometry import Polygon

    inner = Polygon(outline).buffer(-0.5 * gap, join_style="mitre")
    polygons = [p for p in getattr(inner, "geoms", [inner]) if not p.is_empty]
    rings = [ring for p in polygons for ring in (p.exterior, *p.interiors)]
    edges = [
        (one, other)
        for ring in rings
        for one, other in zip(ring.coords[:-1], ring.coords[1:], strict=True)
    ]
    levels = sorted({0.0, height, *(v for edge in edges for _, v in edge)})
    blocks = []
    for low, high in pairwise(levels):
        if high - low <= TOUCH:
            continue
        sides = sorted(
            (_across(edge, low), _across(edge, high))
            for edge in edges
            if min(edge[0][1], edge[1][1]) <= low + 1e-12
            and max(edge[0][1], edge[1][1]) >= high - 1e-12
            and edge[0][1] != edge[1][1]
        )
        bounds = [(0.0, 0.0), *sides, (width, width)]
        for left, right in zip(bounds[::2], bounds[1::2], strict=True):
            if max(right[0] - left[0], right[1] - left[1]) > 0:
                blocks.append(Block(low, high, left[0], left[1], right[0], right[1]))
    return blocks


def _across(edge: tuple[tuple[float, float], tuple[float, float]], level: float) -> float:
    """Where an edge crosses a level."""
    (u0, v0), (u1, v1) = edge
    share = min(max((level - v0) / (v1 - v0), 0.0), 1.0)
    return u0 + share * (u1 - u0)
