"""What fits on the surfaces of a room, said before anything is bought."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from planner.room.geometry import geometry
from planner.room.model import Room
from planner.treat.catalogue import Catalogue, Product
from planner.treat.free_field import TOUCH, Box, Field, field_of
from planner.treat.option import kind_of_surface
from planner.treat.packing import Size, densest

if TYPE_CHECKING:
    from planner.treat.placement import Placement

SHEET_STEP = 0.25
"""Height of the strips beside slanted edges. [m]"""

UPRIGHT_WORDS = ("do not turn", "not to be turned", "upright only")
"""Words in a product's note that forbid turning it by 90°."""


@dataclass(frozen=True, slots=True)
class FittingLimits:
    """The most that fits, for the optimiser."""

    pieces: dict[tuple[str, str], float]
    """By surface and product: pieces, or square metres of goods sold so."""
    area: dict[str, float]
    """By surface: the largest face that one product can cover. [m²]"""

    def tightened(self, placement: Placement) -> FittingLimits:
        """Limits under which what could not be placed cannot be chosen again.

        A surface on which something found no place may carry no more than what found one.
        """
        area = dict(self.area)
        for surface, _ in placement.unplaced:
            placed = sum(panel.width * panel.height for panel in placement.on(surface))
            area[surface] = min(area.get(surface, np.inf), placed)
        return replace(self, area=area)


def fields(room: Room, *, gap: float | None = None) -> dict[str, Field]:
    """Where panels may lie, by surface: around openings, patches with a place and keep-outs.

    Parameters
    ----------
    room
        Surfaces that it keeps clear are left out.
    gap
        Between panels and to everything else; the room's ``panel_gap`` by default. [m]
    """
    space = room.treatment.panel_gap if gap is None else gap
    frames = geometry(room).frames
    return {
        name: field_of(frame, obstacles(room, name), space)
        for name, frame in frames.items()
        if name not in room.treatment.keep_clear
    }


def obstacles(room: Room, surface: str) -> list[Box]:
    """Rectangles of a surface on which nothing may be mounted. [m]."""
    found = [Box(o.left, o.bottom, o.width, o.height) for o in room.openings if o.wall == surface]
    found += [Box(k.left, k.bottom, k.width, k.height) for k in room.keep_outs if k.on == surface]
    for patch in room.patches:
        sides = (patch.left, patch.bottom, patch.width, patch.height)
        if patch.on == surface and None not in sides:
            found.append(Box(*(side or 0.0 for side in sides)))
    return found


def fitting_limits(room: Room, catalogue: Catalogue, *, gap: float | None = None) -> FittingLimits:
    """The most of every product that fits on every surface, alone.

    Pieces are counted by the densest packing in rows or columns, so any number up to the limit can
    be placed. Of a symmetric pair both surfaces have the limit of what is free on both. Different
    products on one surface share its room: when a mixed list cannot be placed, ask again with
    `FittingLimits.tightened`.

    Parameters
    ----------
    room
        With its openings, patches, keep-outs and limits.
    catalogue
        Products; free-standing ones have no limit here.
    gap
        As in `fields`.
    """
    free = fields(room, gap=gap)
    shared = _shared_fields(room, free)
    pieces: dict[tuple[str, str], float] = {}
    area = dict.fromkeys(room.surface_names, 0.0)
    known: dict[tuple[str, Size], float] = {}
    for product in catalogue.values():
        if product.unit == "item":
            continue
        for name in room.surface_names:
            most = 0.0
            if name in shared and kind_of_surface(name) in product.surfaces:
                key = (name, (product.width or 0.0, product.height or 0.0))
                if key not in known:
                    known[key] = _most(shared[name], product)
                most = known[key]
            pieces[name, product.id] = most
            area[name] = max(area[name], most * product.piece_area)
    return FittingLimits(pieces, area)


def _most(field: Field, product: Product) -> float:
    if product.unit == "m2":
        return sum(box.width * box.height for box in sheets(field))
    return float(len(densest(field, sizes_of(field, product))))


def sizes_of(field: Field, product: Product) -> list[Size]:
    """Upright and, where it may be turned, turned; with half a gap on every side. [m]."""
    assert product.width is not None
    assert product.height is not None
    upright = field.grown(product.width, product.height)
    turned = field.grown(product.height, product.width)
    return [upright] if turned == upright or not may_turn(product) else [upright, turned]


def may_turn(product: Product) -> bool:
    """May it hang turned by 90°: yes, unless its note says not (`UPRIGHT_WORDS`)."""
    note = product.note.lower()
    return not any(words in note for words in UPRIGHT_WORDS)


def _shared_fields(room: Room, free: Mapping[str, Field]) -> dict[str, Field]:
    """Of symmetric pairs what is free on both, seen from each; of others what is free."""
    shared = dict(free)
    for one, other in room.treatment.symmetric:
        if one not in free or other not in free:
            shared.pop(one, None)
            shared.pop(other, None)
            continue
        seen = over_there(one, free[other])
        if not same_size(free[one], seen):
            continue
        shared[one] = free[one].both(seen)
        shared[other] = free[other].both(over_there(other, free[one]))
    return shared


def over_there(name: str, partner: Field) -> Field:
    """The partner of a surface in that surface's coordinates: walls that face each other mirror.

    Floor and ceiling are drawn in the same coordinates, one above the other.
    """
    return partner if name in ("floor", "ceiling") else partner.mirrored()


def same_size(one: Field, other: Field) -> bool:
    """Do two surfaces cover each other."""
    return abs(one.width - other.width) < 1e-3 and abs(one.height - other.height) < 1e-3


def sheets(field: Field) -> list[Box]:
    """The free part of a surface as rectangles without gaps, the largest first. [m].

    Between two neighbouring levels at which an obstacle begins or ends, the free stretches are cut
    out; stretches above each other with the same ends are joined. Beside slanted edges the
    rectangles inside are taken, in strips of `SHEET_STEP`: what a fitter cuts to the slant is more.

    Upright strips are taken instead where they give more.
    """
    level = _strips(field)
    if field.is_slanted:
        upright = [box.turned() for box in _strips(field.turned())]
        level = max(level, upright, key=lambda boxes: sum(b.width * b.height for b in boxes))
    return sorted(level, key=lambda box: (-box.width * box.height, box.left, box.bottom))


def _strips(field: Field) -> list[Box]:
    """Rectangles of level strips, without gaps. [m]."""
    steps = [n * SHEET_STEP for n in range(int(field.height / SHEET_STEP) + 1)]
    heights = (field.low, field.high, *field.starts, *field.ends)
    levels = sorted(
        {
            level
            for level in (*heights, *(steps if field.is_slanted else ()))
            if field.low - TOUCH <= level <= field.high + TOUCH
        }
    )
    open_boxes: list[Box] = []
    done: list[Box] = []
    for low, high in pairwise(levels):
        if high - low <= TOUCH:
            continue
        stretches = [
            (left, right) for left, right in field.free(low, high - low) if right - left > TOUCH
        ]
        going = []
        for box in open_boxes:
            same = [s for s in stretches if abs(s[0] - box.left) + abs(s[1] - box.right) < TOUCH]
            if same and abs(box.top - low) < TOUCH:
                going.append(Box(box.left, box.bottom, box.width, high - box.bottom))
                stretches.remove(same[0])
            else:
                done.append(box)
        open_boxes = going + [Box(left, low, right - left, high - low) for left, right in stretches]
    boxes = [box.grown(-0.5 * field.gap) for box in done + open_boxes]
    return [box for box in boxes if box.width > TOUCH and box.height > TOUCH]
