"""Where the panels of an option go: around openings and keep-outs, over the first reflections first.

Coordinates are those a fitter measures: from the named lower left corner of a surface as seen from
inside, upwards from the finished floor; on floor and ceiling along x and y from their smallest.
What does not fit is known before it is bought: `fitting_limits` gives the optimiser the most of
every product on every surface, and each of those limits can be placed by `place`.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Mapping
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from planner.errors import OptionError
from planner.room.geometry import Frame, geometry
from planner.room.model import Room
from planner.treat.catalogue import FREE, Catalogue
from planner.treat.fitting import FittingLimits, fields, fitting_limits
from planner.treat.free_field import Box, Field
from planner.treat.laying import Wish
from planner.treat.option import Option, OptionItem, kind_of_surface
from planner.treat.placing import Job

__all__ = ["FittingLimits", "PlacedPanel", "Placement", "fitting_limits", "place"]

EAR_HEIGHT = 1.2
"""Height at which rows are centred on walls where no seat is given (common practice, no source). [m]"""


class Rectangle(Protocol):
    """A rectangle on a surface, such as `planner.treat.problem.Cover`; a weight may come with it."""

    @property
    def surface(self) -> str:
        """Name of the surface."""
        ...

    @property
    def left(self) -> float:
        """[m]."""
        ...

    @property
    def bottom(self) -> float:
        """[m]."""
        ...

    @property
    def width(self) -> float:
        """[m]."""
        ...

    @property
    def height(self) -> float:
        """[m]."""
        ...


@dataclass(frozen=True, slots=True)
class PlacedPanel:
    """One panel on the drawing, or one rectangle of goods by the square metre."""

    number: int
    """From 1, surface by surface, left to right, bottom to top."""
    product: str
    surface: str
    left: float
    """From the surface's left end as seen from inside. [m]"""
    bottom: float
    """From the finished floor; on floor and ceiling along v. [m]"""
    width: float
    """As it hangs. [m]"""
    height: float
    """As it hangs. [m]"""
    thickness_mm: float | None
    """[mm]"""
    gap_mm: float | None
    """Air behind it. [mm]"""

    @property
    def rectangle(self) -> tuple[float, float, float, float]:
        """left, bottom, width, height. [m]."""
        return (self.left, self.bottom, self.width, self.height)


@dataclass(frozen=True, slots=True)
class Placement:
    """The panels of an option on their surfaces."""

    panels: tuple[PlacedPanel, ...]
    unplaced: dict[tuple[str, str], float]
    """By surface and product: pieces, or square metres, that found no place."""
    warnings: tuple[str, ...]

    def on(self, surface: str) -> tuple[PlacedPanel, ...]:
        """Panels of one surface."""
        return tuple(panel for panel in self.panels if panel.surface == surface)

    def in_option(self, option: Option) -> Option:
        """The option with the places of every item that found room for all its pieces."""
        items = []
        for item in option.items:
            places = tuple(
                panel.rectangle
                for panel in self.panels
                if (panel.surface, panel.product) == (item.surface, item.product)
            )
            whole = (item.surface, item.product) not in self.unplaced and places
            if whole and (item.count is None or item.count == len(places)):
                item = item.model_copy(update={"placement": places})
            items.append(item)
        return option.model_copy(update={"items": tuple(items)})


def place(
    room: Room,
    option: Option,
    catalogue: Catalogue,
    *,
    covers: Iterable[Rectangle] = (),
    pressure: Mapping[str, NDArray[np.float64]] | None = None,
    bass: Collection[str] | None = None,
    centred: Mapping[str, str] | None = None,
    gap: float | None = None,
) -> Placement:
    """Lay the panels of an option on their surfaces.

    Parameters
    ----------
    room
        With its openings, patches, keep-outs, symmetric pairs and gap.
    option
        Items that have a placement keep it; free-standing things are left out.
    catalogue
        Its products.
    covers
        Rectangles to be covered first, such as first reflections.
    pressure
        By surface, how hard the modes to be damped press, shape ``(v, u)`` over the surface's
        bounding box from its lower left corner: bass panels go where that is large.
    bass
        Products that follow `pressure`; by default those that absorb more at 63 and 125 Hz than
        from 1 to 4 kHz.
    centred
        Surfaces to be mirrored about their own middle: ``"u"`` for left against right, ``"v"`` for
        bottom against top. By default those that the room's symmetric pairs cut in the middle.
        Where panels do not fit so, they are laid without it, and that is said.
    gap
        As in `fields`.

    Returns
    -------
    placement
        Deterministic; panels never overlap, never leave their surface, never lie on an opening, a
        patch with a place or a keep-out.

    Raises
    ------
    OptionError
        An item names a surface the room does not have, or one it keeps clear, or has a placement
        that is impossible.
    """
    free = fields(room, gap=gap)
    frames = geometry(room).frames
    items = [item for item in option.items if item.surface != FREE]
    for number, item in enumerate(items, 1):
        _check_surface(item, number, free, frames)
    low = _bass(catalogue, option) if bass is None else frozenset(bass)
    middles = _middles(room) if centred is None else dict(centred)
    wishes = {
        name: _wish(room, name, frames[name], covers, (pressure or {}).get(name)) for name in free
    }
    job = Job(room, free, catalogue, items, low, middles, wishes)
    job.run()
    return _numbered(room, job)


def _check_surface(
    item: OptionItem, number: int, free: Mapping[str, Field], frames: Mapping[str, Frame]
) -> None:
    if item.surface in free:
        return
    where = f"[[item]] {number}"
    if item.surface in frames:
        raise OptionError(
            f"{item.surface!r} is to be kept clear",
            where=where,
            cure="Choose another surface, or take it out of keep_clear.",
        )
    raise OptionError(
        f"there is no surface {item.surface!r}",
        where=where,
        cure=f"The surfaces: {', '.join(frames)}.",
    )


def _bass(catalogue: Catalogue, option: Option) -> frozenset[str]:
    """Products that take more from the bass than from the treble."""
    found = set()
    for name in option.products:
        alpha = catalogue.find(name).coefficients.alpha
        if alpha[:2].mean() > alpha[4:7].mean():
            found.add(name)
    return frozenset(found)


def _middles(room: Room) -> dict[str, str]:
    """Surfaces that the mid-planes of the room's symmetric pairs cut, and along which axis.

    A pair of facing walls has the plane halfway between them; it cuts the other walls of a
    rectangle upright, and floor and ceiling along the pair's direction.
    """
    found: dict[str, str] = {}
    if not room.is_rectangle:
        return found
    for one, other in room.treatment.symmetric:
        if {one, other} == {"left", "right"}:
            found |= {"front": "u", "back": "u", "ceiling": "v", "floor": "v"}
        elif {one, other} == {"front", "back"}:
            found |= {"left": "u", "right": "u", "ceiling": "u", "floor": "u"}
    for name in (name for pair in room.treatment.symmetric for name in pair):
        found.pop(name, None)
    return found


def _wish(
    room: Room,
    name: str,
    frame: Frame,
    covers: Iterable[Rectangle],
    weights: NDArray[np.float64] | None,
) -> Wish:
    targets = tuple(
        (Box(c.left, c.bottom, c.width, c.height), float(getattr(c, "weight", 1.0)))
        for c in covers
        if c.surface == name
    )
    middle = None
    if kind_of_surface(name) == "wall":
        seat = room.positions.seat
        middle = EAR_HEIGHT if seat is None else seat[2]
    return Wish(cover=targets, pressure=_presser(frame, weights), middle=middle)


def _presser(frame: Frame, weights: NDArray[np.float64] | None) -> Callable[[Box], float] | None:
    """Mean of the weights under a panel, relative to their largest."""
    if weights is None or not np.any(weights):
        return None
    values = np.asarray(weights, float) / np.max(np.abs(weights))
    rows, columns = values.shape
    u = (np.arange(columns) + 0.5) * frame.width / columns
    v = (np.arange(rows) + 0.5) * frame.height / rows
    total = np.zeros((rows + 1, columns + 1))
    total[1:, 1:] = values.cumsum(axis=0).cumsum(axis=1)

    def press(box: Box) -> float:
        left, right = np.searchsorted(u, (box.left, box.right))
        bottom, top = np.searchsorted(v, (box.bottom, box.top))
        if right <= left or top <= bottom:
            return 0.0
        under = total[top, right] - total[bottom, right] - total[top, left] + total[bottom, left]
        return float(under / ((right - left) * (top - bottom)))

    return press


def _numbered(room: Room, job: Job) -> Placement:
    rows = sorted(
        (room.surface_names.index(item.surface), round(b.left, 4), round(b.bottom, 4), n, b)
        for n, item in enumerate(job.items)
        for b in job.laid[n]
    )
    panels = []
    for count, (_, _, _, number, box) in enumerate(rows, 1):
        product = job.product(number)
        panels.append(
            PlacedPanel(
                number=count,
                product=product.id,
                surface=job.items[number].surface,
                left=max(box.left, 0.0),
                bottom=max(box.bottom, 0.0),
                width=box.width,
                height=box.height,
                thickness_mm=product.thickness_mm,
                gap_mm=product.gap_mm,
            )
        )
    unplaced: dict[tuple[str, str], float] = {}
    notes = list(job.warnings)
    for number, item in enumerate(job.items):
        missing = job.missing(number)
        if missing > 1e-4:
            key = (item.surface, item.product)
            unplaced[key] = unplaced.get(key, 0.0) + missing
            amount = f"{missing:.0f}" if item.count is not None else f"{missing:.2f} m²"
            notes.append(f"{item.surface}: {amount} of {item.product} find no place.")
    return Placement(tuple(panels), unplaced, tuple(notes))
