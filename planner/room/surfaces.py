"""Everything that absorbs in one room, as arrays: this is what the physics works on."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from planner.absorption.library import Coefficients, Library, Material, builtin, coefficients
from planner.bands import OCTAVES
from planner.errors import InputError, MaterialError, OptionError, RoomError
from planner.room.geometry import geometry
from planner.room.model import Furnishing, OwnMaterial, Room

HARD_OBJECT = "hard-object"
"""Furnishing whose absorption follows from its volume (EN 12354-6:2003, formula 4)."""


def _no_items() -> NDArray[np.float64]:
    return np.zeros((0, len(OCTAVES)))


@dataclass(frozen=True, slots=True)
class Part:
    """A piece of one surface with one material."""

    name: str
    on: str
    """The surface it belongs to."""
    material: str
    kind: str
    """``base``, ``patch``, ``opening`` or ``panel``."""
    normal: tuple[float, float, float]
    """Into the room."""


@dataclass(frozen=True, slots=True)
class RoomSurfaces:
    """Areas and coefficients of a room, complete: what a table leaves out is filled and marked."""

    volume: float
    """[m³]"""
    surface_area: float
    """[m²]"""
    parts: tuple[Part, ...]
    area: NDArray[np.float64]
    """Shape ``(part,)``. [m²]"""
    alpha: NDArray[np.float64]
    """Absorption coefficients, shape ``(part, band)``. [-]"""
    u: NDArray[np.float64]
    """Their standard uncertainty, shape ``(part, band)``. [-]"""
    assumed: NDArray[np.bool_]
    """Where no source gives a value, shape ``(part, band)``."""
    items: tuple[str, ...] = ()
    """Furnishings and free-standing things, one name per entry."""
    item_count: NDArray[np.float64] = field(default_factory=lambda: np.zeros(0))
    """Shape ``(item,)``."""
    item_area: NDArray[np.float64] = field(default_factory=_no_items)
    """Absorption area of one piece, shape ``(item, band)``. [m²]"""
    item_u: NDArray[np.float64] = field(default_factory=_no_items)
    """[m²]"""
    item_assumed: NDArray[np.bool_] = field(
        default_factory=lambda: np.zeros((0, len(OCTAVES)), bool)
    )
    object_volume: float = 0.0
    """Volume taken by hard objects (EN 12354-6). [m³]"""
    dimension_u: float = 0.01
    """Standard uncertainty of the dimensions. [m]"""
    dimensions: tuple[float, float, float] = (0.0, 0.0, 0.0)
    """Length, width and height of the bounding box. [m]"""

    @property
    def absorption_area(self) -> NDArray[np.float64]:
        """Equivalent absorption area of surfaces and furnishings, shape ``(band,)``. [m²]."""
        total: NDArray[np.float64] = self.area @ self.alpha + self.item_count @ self.item_area
        return total

    @property
    def mean_alpha(self) -> NDArray[np.float64]:
        """Absorption area over surface area, shape ``(band,)``. [-]."""
        return self.absorption_area / self.surface_area

    @property
    def materials(self) -> tuple[str, ...]:
        """Distinct material ids in order of first use."""
        return tuple(dict.fromkeys(part.material for part in self.parts))

    @property
    def material_index(self) -> NDArray[np.intp]:
        """Position in `materials` of each part, shape ``(part,)``."""
        order = {name: index for index, name in enumerate(self.materials)}
        return np.array([order[part.material] for part in self.parts], dtype=np.intp)

    @property
    def assumed_hz(self) -> tuple[int, ...]:
        """Bands in which a coefficient or item of this room is assumed. [Hz]."""
        somewhere: NDArray[np.bool_] = np.any(np.vstack([self.assumed, self.item_assumed]), axis=0)
        return tuple(hz for hz, flag in zip(OCTAVES, somewhere, strict=True) if flag)

    def area_on(self, surface: str, *kinds: str) -> float:
        """Area of the parts of one surface, of all kinds or those named. [m²]."""
        return sum(
            float(area)
            for part, area in zip(self.parts, self.area, strict=True)
            if part.on == surface and (not kinds or part.kind in kinds)
        )

    def covered(
        self, on: str, name: str, material: str, area: float, values: Coefficients
    ) -> RoomSurfaces:
        """The room with `area` of a treatment mounted on the surface `on`.

        Its face hides what is behind it: first the bare surface, then what patches cover.

        Raises
        ------
        OptionError
            The surface does not exist or has less free area than that.
        """
        numbers = [n for n, part in enumerate(self.parts) if part.on == on]
        if not numbers:
            raise OptionError(f"there is no surface {on!r}", where=name)
        hidden = [n for n in numbers if self.parts[n].kind == "base"]
        hidden += [n for n in numbers if self.parts[n].kind == "patch"]
        free = float(self.area[hidden].sum())
        if area > free + 1e-6:
            raise OptionError(
                f"{area:.2f} m² of {name!r} do not fit on {on!r}, which has {free:.2f} m² free",
                cure="Take fewer, or spread them over other surfaces.",
            )
        rest, left = self.area.copy(), area
        for number in hidden:
            taken = min(rest[number], left)
            rest[number] -= taken
            left -= taken
        part = Part(name, on, material, "panel", self.parts[numbers[0]].normal)
        return replace(
            self,
            parts=(*self.parts, part),
            area=np.append(rest, area),
            alpha=np.vstack([self.alpha, values.alpha]),
            u=np.vstack([self.u, values.u]),
            assumed=np.vstack([self.assumed, values.assumed]),
        )

    def with_item(self, name: str, count: float, values: Coefficients) -> RoomSurfaces:
        """The room with `count` free-standing pieces of absorption area `values.alpha` each."""
        return replace(
            self,
            items=(*self.items, name),
            item_count=np.append(self.item_count, count),
            item_area=np.vstack([self.item_area, values.alpha]),
            item_u=np.vstack([self.item_u, values.u]),
            item_assumed=np.vstack([self.item_assumed, values.assumed]),
        )


def own_material(own: OwnMaterial) -> Material:
    """The library row of a material that the room file defines.

    Raises
    ------
    MaterialError
        Its coefficients or layers cannot be used.
    """
    if own.build_up is not None:
        from planner.absorption.build_up import material_from_build_up

        return material_from_build_up(own.id, own.description or own.id, own.build_up)
    from planner.absorption.library import material_from_values

    return material_from_values(
        own.id, own.alpha, u=own.u, description=own.description or own.id, source=own.source
    )


def room_library(room: Room, library: Library | None = None) -> Library:
    """The materials a room may name: the tables and its own.

    Raises
    ------
    RoomError
        One of its own materials cannot be used.
    """
    own = []
    for material in room.materials:
        try:
            own.append(own_material(material))
        except MaterialError as error:
            inner = error.where or repr(material.id)
            named = inner if repr(material.id) in inner else f"{material.id!r}, {inner}"
            where = f"[[material]] {named}"
            raise RoomError(error.what, where=where, cure=error.cure) from error
    return (library or builtin()).with_own(own)


def room_surfaces(room: Room, library: Library | None = None) -> RoomSurfaces:
    """Areas and coefficients of a room as it is described.

    Parameters
    ----------
    room
        The room.
    library
        Materials to look up besides the room's own; the built-in tables by default.

    Raises
    ------
    RoomError
        A material or furnishing that no table has, or one used where it does not belong.
    """
    known = room_library(room, library)
    shape = geometry(room)
    rows = list(_rows(room, shape.areas))
    values = [_surface_values(known, part, where) for part, _, where in rows]
    items = [_item_values(known, thing, n) for n, thing in enumerate(room.furnishings, 1)]
    bands = len(OCTAVES)
    return RoomSurfaces(
        volume=shape.volume,
        surface_area=shape.surface_area,
        parts=tuple(part for part, _, _ in rows),
        area=np.array([area for _, area, _ in rows]),
        alpha=np.array([value.alpha for value in values]),
        u=np.array([value.u for value in values]),
        assumed=np.array([value.assumed for value in values]),
        items=tuple(thing.item for thing in room.furnishings),
        item_count=np.array([thing.count for thing in room.furnishings], float),
        item_area=np.array([value.alpha for value in items]).reshape(-1, bands),
        item_u=np.array([value.u for value in items]).reshape(-1, bands),
        item_assumed=np.array([value.assumed for value in items], bool).reshape(-1, bands),
        object_volume=sum(thing.count * (thing.volume or 0.0) for thing in room.furnishings),
        dimension_u=room.shape.uncertainty,
        dimensions=room.dimensions,
    )


def _rows(room: Room, gross: dict[str, float]) -> Iterator[tuple[Part, float, str]]:
    """Every part with its area and the key that names its material."""
    normals = {
        name: (float(f.normal[0]), float(f.normal[1]), float(f.normal[2]))
        for name, f in geometry(room).frames.items()
    }
    free = dict(gross)
    extra: list[tuple[Part, float, str]] = []
    names: dict[str, int] = {}

    def unique(name: str) -> str:
        names[name] = names.get(name, 0) + 1
        return name if names[name] == 1 else f"{name} {names[name]}"

    for number, opening in enumerate(room.openings, 1):
        name = unique(f"{opening.kind} in {opening.wall}")
        part = Part(name, opening.wall, opening.material, "opening", normals[opening.wall])
        extra.append((part, opening.area, f"[[opening]] {number}, material"))
        free[opening.wall] -= opening.area
    for number, patch in enumerate(room.patches, 1):
        name = unique(f"patch on {patch.on}")
        part = Part(name, patch.on, patch.material, "patch", normals[patch.on])
        extra.append((part, patch.covered, f"[[patch]] {number}, material"))
        free[patch.on] -= patch.covered
    for name, material in room.surface_materials.items():
        where = (
            f"[surfaces] {name}" if name in ("floor", "ceiling") else f"[surfaces] walls, {name}"
        )
        yield Part(name, name, material, "base", normals[name]), max(free[name], 0.0), where
    yield from extra


def _surface_values(library: Library, part: Part, where: str) -> Coefficients:
    try:
        material = library.find(part.material)
    except MaterialError as error:
        raise RoomError(error.what, where=where, cure=error.cure) from error
    if material.per_item:
        raise RoomError(
            f"{material.id!r} is a furnishing, counted in pieces, not a surface",
            where=where,
            cure="List it under [[furnishing]] with a count.",
        )
    return coefficients(material)


def _item_values(library: Library, thing: Furnishing, number: int) -> Coefficients:
    where = f"[[furnishing]] {number}, item"
    if thing.item == HARD_OBJECT:
        return _hard_object(thing, where)
    try:
        material = library.find(thing.item)
    except InputError as error:
        raise RoomError(error.what, where=where, cure=error.cure) from error
    if not material.per_item:
        raise RoomError(
            f"{thing.item!r} is a surface material, given per square metre",
            where=where,
            cure="List it under [[patch]] with its area.",
        )
    return coefficients(material)


def _hard_object(thing: Furnishing, where: str) -> Coefficients:
    """A_obj = V^(2/3), at every band; how well that holds is not stated, so u is half of it."""
    if not thing.volume:
        raise RoomError(
            "a hard object needs its volume", where=where, cure="Add volume = 0.4 (m³)."
        )
    area = np.full(len(OCTAVES), thing.volume ** (2.0 / 3.0))
    return Coefficients(alpha=area, u=0.5 * area, assumed=np.zeros(len(OCTAVES), bool))
