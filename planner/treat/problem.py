"""What may be chosen and within which limits, as arrays: a room, a catalogue and its limits."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import chain

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.errors import CatalogueError, OptionError
from planner.room.model import TreatmentLimits
from planner.room.surfaces import RoomSurfaces
from planner.treat.catalogue import FREE, Catalogue, Product
from planner.treat.option import Option, OptionItem, kind_of_surface
from planner.treat.windows import absorption_area, counted

FREE_SHARE = 0.10
"""Free-standing things take at most this share of the floor (a judgement, no source). [-]"""
FREE_FOOTPRINT = 0.25
"""Footprint of a free-standing thing whose size is not given. [m²]"""
REFLECTION_ALPHA = 0.5
"""Least coefficient, mean of 1 to 4 kHz, over a first reflection (a judgement, no source). [-]"""

EVEN_BANDS = np.array([500 <= hz <= 4000 for hz in OCTAVES])
"""Bands over which evenness is asked for."""
_MIDDLE_HIGH = np.array([1000 <= hz <= 4000 for hz in OCTAVES])

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Cover:
    """A rectangle of a surface that must be covered, such as a first reflection."""

    surface: str
    left: float
    """[m]"""
    bottom: float
    """[m]"""
    width: float
    """[m]"""
    height: float
    """[m]"""


@dataclass(frozen=True, slots=True)
class Choice:
    """One product on one surface, or the same on both of a symmetric pair."""

    product: Product
    on: tuple[str, ...]
    upper: float
    """Most that fit on each surface: pieces, or square metres."""

    @property
    def is_continuous(self) -> bool:
        """Any area will do, not whole pieces only."""
        return self.product.unit == "m2"


@dataclass(frozen=True, slots=True)
class Cap:
    """A linear limit: weights · amounts ≤ most."""

    kind: str
    """``area``, ``weight`` or ``floor space``."""
    surface: str
    weights: Array
    """Per unit of each choice, shape ``(choice,)``."""
    most: float


@dataclass(frozen=True, slots=True)
class Problem:
    """Everything the programme needs to know."""

    surfaces: RoomSurfaces
    limits: TreatmentLimits
    choices: tuple[Choice, ...]
    products: tuple[Product, ...]
    """Those of the choices."""
    product_of: NDArray[np.intp]
    """Which product each choice is, shape ``(choice,)``."""
    copies: Array
    """Surfaces each choice covers, shape ``(choice,)``."""
    caps: tuple[Cap, ...]
    covers: tuple[Cover, ...]
    is_priced: bool
    """Cost is money; otherwise it is area. [currency] or [m²]"""
    currency: str
    warnings: tuple[str, ...]

    def start(self, formula: str) -> Array:
        """Absorption area of the untreated room, shape ``(band,)``. [m²]."""
        return absorption_area(self.surfaces, formula)

    def effect(self, formula: str) -> Array:
        """What one unit of each choice adds, shape ``(choice, band)``. [m²]."""
        return np.array(
            [
                sum(self._gain(choice.product, on, formula) for on in choice.on)
                for choice in self.choices
            ]
        ).reshape(len(self.choices), len(OCTAVES))

    def standing_effect(self) -> Array:
        """Absorption area of one free-standing thing, 0 for the rest, ``(choice, band)``. [m²]."""
        return np.array(
            [
                np.asarray(choice.product.coefficients.alpha, float)
                * (choice.product.unit == "item")
                for choice in self.choices
            ]
        ).reshape(len(self.choices), len(OCTAVES))

    def _gain(self, product: Product, on: str, formula: str) -> Array:
        """Of one unit on one surface: its own absorption less that of what it hides. [m²]."""
        if product.unit == "item":
            return np.asarray(product.coefficients.alpha, float)
        base = base_part(self.surfaces, on)
        behind = counted(self.surfaces.alpha[base], formula)
        gain: Array = product.piece_area * (counted(product.coefficients.alpha, formula) - behind)
        return gain

    def axis_areas(self, formula: str) -> tuple[Array, Array, Array]:
        """Surface, absorption area and what each choice adds to it, along each of the three axes.

        A surface counts for an axis by the square of its normal's component along it.

        Returns
        -------
        size, start, effect
            Shapes ``(3,)``, ``(3, band)`` and ``(choice, 3, band)``. [m²]
        """
        normals = np.array([part.normal for part in self.surfaces.parts]) ** 2
        alpha = counted(self.surfaces.alpha, formula)
        size = normals.T @ self.surfaces.area
        start = np.einsum("pj,p,pb->jb", normals, self.surfaces.area, alpha)
        effect = np.zeros((len(self.choices), 3, len(OCTAVES)))
        for row, choice in zip(effect, self.choices, strict=True):
            for on in choice.on if choice.product.unit != "item" else ():
                axis = normals[base_part(self.surfaces, on)]
                row += np.outer(axis, self._gain(choice.product, on, formula))
        return size, start, effect

    @property
    def pack_price(self) -> Array:
        """Price of a pack, or its area where nothing has a price, shape ``(product,)``."""
        if self.is_priced:
            return np.array([product.price_per_pack or 0.0 for product in self.products])
        return np.array(
            [
                product.pack
                if product.unit == "m2"
                else product.pack * (product.piece_area or _footprint(product))
                for product in self.products
            ]
        )

    def option(self, amounts: Array, name: str) -> Option:
        """Amounts per choice, shape ``(choice,)``, as an option."""
        items = []
        for choice, amount in zip(self.choices, amounts, strict=True):
            if amount <= (1e-6 if choice.is_continuous else 0.5):
                continue
            for on in choice.on:
                if choice.is_continuous:
                    items.append(
                        OptionItem(
                            product=choice.product.id, surface=on, area=round(float(amount), 6)
                        )
                    )
                else:
                    items.append(
                        OptionItem(
                            product=choice.product.id, surface=on, count=round(float(amount))
                        )
                    )
        return Option(name=name, items=tuple(items))

    def packs(self, amounts: Array) -> NDArray[np.int64]:
        """Whole packs needed of each product, shape ``(product,)``."""
        needed = np.zeros(len(self.products))
        np.add.at(needed, self.product_of, self.copies * amounts)
        sizes = np.array([product.pack for product in self.products])
        packs: NDArray[np.int64] = np.ceil(needed / sizes - 1e-6).astype(np.int64)
        return packs

    def cost(self, amounts: Array) -> float:
        """Of whole packs; area where nothing has a price. [currency] or [m²]."""
        return float(self.packs(amounts) @ self.pack_price)


def base_part(surfaces: RoomSurfaces, on: str) -> int:
    """Number of the part that is the bare surface."""
    for number, part in enumerate(surfaces.parts):
        if part.on == on and part.kind == "base":
            return number
    raise OptionError(f"there is no surface {on!r}", cure="Name a surface of the room.")


def problem(
    surfaces: RoomSurfaces,
    catalogue: Catalogue,
    limits: TreatmentLimits,
    *,
    area_limits: Mapping[str, float] | None = None,
    piece_limits: Mapping[tuple[str, str], float] | None = None,
    covers: Sequence[Cover] = (),
) -> Problem:
    """Everything that may be chosen for a room.

    Parameters
    ----------
    surfaces
        The room as it is. Panels go on bare surface; openings and patches stay uncovered.
    catalogue
        Products to choose from.
    limits
        The room file's ``[treatment]``.
    area_limits
        Most that can be mounted on a surface, by name, from the placement. [m²]
    piece_limits
        Most pieces of a product on a surface, by ``(surface, product)``, from the placement.
    covers
        Rectangles that must be covered.

    Raises
    ------
    CatalogueError
        Prices in several currencies, or none in the room's.
    OptionError
        A limit names a surface that the room does not have, or a rectangle to be covered lies
        where nothing may go.
    """
    warnings: list[str] = []
    priced = catalogue.is_priced
    _check_currency(catalogue, limits.currency)
    usable = _usable(catalogue, limits, priced, warnings)
    most = _areas(surfaces, limits, area_limits or {})
    groups = _groups(surfaces, limits)
    choices = tuple(
        choice
        for product in usable
        for choice in _choices(product, groups, most, limits, piece_limits or {})
    )
    caps = tuple(_caps(choices, most, limits, surfaces))
    choices = _bounded(choices, caps)
    products = tuple({choice.product.id: choice.product for choice in choices}.values())
    order = {product.id: index for index, product in enumerate(products)}
    return Problem(
        surfaces=surfaces,
        limits=limits,
        choices=choices,
        products=products,
        product_of=np.array([order[choice.product.id] for choice in choices], dtype=np.intp),
        copies=np.array([float(len(choice.on)) for choice in choices]),
        caps=caps,
        covers=tuple(merged(covers)),
        is_priced=priced,
        currency=limits.currency,
        warnings=tuple(warnings),
    )


def _check_currency(catalogue: Catalogue, currency: str) -> None:
    for product in catalogue.values():
        if product.price_per_pack is None or product.currency in ("", currency.upper()):
            continue
        raise CatalogueError(
            f"{product.id!r} is priced in {product.currency}, the room in {currency}",
            file=catalogue.file,
            cure="Write all prices in one currency and set currency under [treatment].",
        )


def _usable(
    catalogue: Catalogue, limits: TreatmentLimits, priced: bool, warnings: list[str]
) -> list[Product]:
    """Products that the limits allow; what is left out for want of data is said."""
    usable, unpriced, unsized = [], [], []
    for product in catalogue.values():
        if limits.rented and product.needs_fixings:
            continue
        if priced and product.price_per_pack is None:
            unpriced.append(product.id)
        elif not _depth_allowed(product, limits):
            if product.depth_mm is None:
                unsized.append(product.id)
        else:
            usable.append(product)
    if unpriced:
        warnings.append(f"left out because they have no price: {', '.join(unpriced)}")
    if unsized:
        warnings.append(f"left out because their thickness is not given: {', '.join(unsized)}")
    if not priced and limits.budget is not None:
        warnings.append("the budget was not applied: no product has a price")
    if not usable:
        warnings.append("no product is left that the limits allow")
    return usable


def _depth_allowed(product: Product, limits: TreatmentLimits) -> bool:
    """Thickness and gap within the limits; what lies on the floor or stands free is not asked."""
    least, most = limits.min_thickness_mm, limits.max_depth_mm
    if (least is None and most is None) or not {"wall", "ceiling"} & set(product.surfaces):
        return True
    depth = product.depth_mm
    if depth is None:
        return False
    return (least is None or depth >= least) and (most is None or depth <= most)


def _areas(
    surfaces: RoomSurfaces, limits: TreatmentLimits, given: Mapping[str, float]
) -> dict[str, float]:
    """Most that may be mounted on each surface: its bare part, the cover limit, the placement's."""
    names = dict.fromkeys(part.on for part in surfaces.parts)
    mentioned = (
        given,
        limits.max_cover,
        limits.max_weight_kg,
        limits.keep_clear,
        *limits.symmetric,
    )
    for name in chain.from_iterable(mentioned):
        if name not in names and name != FREE:
            raise OptionError(
                f"there is no surface {name!r}", cure=f"This room has {', '.join(names)}."
            )
    most = {}
    for name in names:
        bare = surfaces.area_on(name, "base")
        shared = bare * limits.max_cover.get(name, 1.0)
        most[name] = max(0.0, min(bare, shared, given.get(name, np.inf)))
        if name in limits.keep_clear:
            most[name] = 0.0
    return most


def _groups(surfaces: RoomSurfaces, limits: TreatmentLimits) -> list[tuple[str, ...]]:
    """Surfaces that get the same panels, the rest alone."""
    groups: list[tuple[str, ...]] = [tuple(pair) for pair in limits.symmetric]
    taken = set(chain.from_iterable(groups))
    alone = [(name,) for name in dict.fromkeys(part.on for part in surfaces.parts)]
    return groups + [name for name in alone if name[0] not in taken]


def _choices(
    product: Product,
    groups: Sequence[tuple[str, ...]],
    most: Mapping[str, float],
    limits: TreatmentLimits,
    pieces: Mapping[tuple[str, str], float],
) -> list[Choice]:
    if product.unit == "item":
        if FREE in limits.keep_clear or "floor" in limits.keep_clear:
            return []
        return [Choice(product, (FREE,), pieces.get((FREE, product.id), np.inf))]
    found = []
    for group in groups:
        if not all(kind_of_surface(on) in product.surfaces for on in group):
            continue
        if product.weight_kg is None and any(on in limits.max_weight_kg for on in group):
            continue
        fits = [
            min(most[on] / product.piece_area, pieces.get((on, product.id), np.inf)) for on in group
        ]
        upper = min(fits) if product.unit == "m2" else float(np.floor(min(fits) + 1e-9))
        if upper > 0:
            found.append(Choice(product, group, upper))
    return found


def _caps(
    choices: Sequence[Choice],
    most: Mapping[str, float],
    limits: TreatmentLimits,
    surfaces: RoomSurfaces,
) -> list[Cap]:
    caps = []
    for name, area in most.items():
        here = np.array([float(name in choice.on) for choice in choices])
        if not here.any():
            continue
        faces = np.array([choice.product.piece_area for choice in choices])
        caps.append(Cap("area", name, here * faces, area))
        if name in limits.max_weight_kg:
            heavy = np.array([choice.product.weight_kg or 0.0 for choice in choices])
            caps.append(Cap("weight", name, here * heavy, limits.max_weight_kg[name]))
    standing = np.array(
        [_footprint(c.product) if c.product.unit == "item" else 0.0 for c in choices]
    )
    if standing.any():
        floor = surfaces.area_on("floor", "base", "patch")
        caps.append(Cap("floor space", FREE, standing, FREE_SHARE * floor))
    return caps


def _bounded(choices: Sequence[Choice], caps: Sequence[Cap]) -> tuple[Choice, ...]:
    """The choices with the largest amount that the caps leave each of them."""
    bounded = []
    for number, choice in enumerate(choices):
        most = [cap.most / cap.weights[number] for cap in caps if cap.weights[number] > 0]
        upper = min(choice.upper, *most) if most else choice.upper
        whole = upper if choice.is_continuous else float(np.floor(upper + 1e-9))
        bounded.append(replace(choice, upper=whole))
    return tuple(bounded)


def _footprint(product: Product) -> float:
    if product.width is None or product.thickness_mm is None:
        return FREE_FOOTPRINT
    return product.width * max(product.thickness_mm, 100.0) / 1000.0


def merged(covers: Sequence[Cover]) -> list[Cover]:
    """Rectangles with those that overlap on one surface joined into their common frame."""
    rest = list(covers)
    found: list[Cover] = []
    while rest:
        one = rest.pop(0)
        other = next((c for c in rest if _overlap(one, c)), None)
        if other is None:
            found.append(one)
            continue
        rest.remove(other)
        left, bottom = min(one.left, other.left), min(one.bottom, other.bottom)
        right = max(one.left + one.width, other.left + other.width)
        top = max(one.bottom + one.height, other.bottom + other.height)
        rest.insert(0, Cover(one.surface, left, bottom, right - left, top - bottom))
    return found


def _overlap(one: Cover, other: Cover) -> bool:
    return (
        one.surface == other.surface
        and one.left < other.left + other.width
        and other.left < one.left + one.width
        and one.bottom < other.bottom + other.height
        and other.bottom < one.bottom + one.height
    )


def pieces_to_cover(product: Product, cover: Cover) -> float:
    """Pieces of one product (or square metres) that cover a rectangle, laid either way round."""
    if product.unit == "m2":
        return cover.width * cover.height
    assert product.width is not None
    assert product.height is not None
    ways = [
        np.ceil(cover.width / across - 1e-9) * np.ceil(cover.height / up - 1e-9)
        for across, up in ((product.width, product.height), (product.height, product.width))
    ]
    return float(min(ways))


def absorbs_reflections(product: Product) -> bool:
    """Takes enough of a first reflection to be counted as covering it."""
    return (
        product.unit != "item"
        and float(np.mean(product.coefficients.alpha[_MIDDLE_HIGH])) >= REFLECTION_ALPHA
    )
