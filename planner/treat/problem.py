"""A room to be treated as arrays: what may be chosen, what it does, within which limits."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.errors import OptionError
from planner.room.model import TreatmentLimits
from planner.room.surfaces import RoomSurfaces
from planner.treat.catalogue import Product
from planner.treat.covers import Cover
from planner.treat.option import Option, OptionItem
from planner.treat.windows import absorption_area, counted

FREE_FOOTPRINT = 0.25
"""Footprint of a free-standing thing whose size is not given. [m²]"""

EVEN_BANDS = np.array([500 <= hz <= 4000 for hz in OCTAVES])
"""Bands over which evenness is asked for."""

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Choice:
    """One product on one surface, or the same on both of a symmetric pair."""

    product: Product
    on: tuple[str, ...]
    upper: float
    """Most that may go on each surface: pieces, or square metres."""
    fits: float = np.inf
    """Most that would fit if the room file limited neither cover nor weight."""

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
    possible: float = np.inf
    """What the limit could at most be raised to."""


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
                else product.pack * (product.piece_area or footprint(product))
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


def footprint(product: Product) -> float:
    """Floor that a free-standing thing takes. [m²]."""
    if product.width is None or product.thickness_mm is None:
        return FREE_FOOTPRINT
    return product.width * max(product.thickness_mm, 100.0) / 1000.0
