"""What can be bought: products with their sizes, packs, prices and coefficients.

Three kinds of goods, told apart by `Product.unit`: ``piece`` (a panel of fixed size), ``m2`` (carpet,
curtain: any area, sold in whole packs of square metres) and ``item`` (free-standing, absorption
area per item, hides no surface).
"""

from __future__ import annotations

import functools
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path
from typing import Any, Literal

from planner.absorption.library import Coefficients
from planner.errors import CatalogueError

Unit = Literal["piece", "m2", "item"]

FREE = "free"
"""Word of `Product.surfaces` for things that stand in the room and cover no surface."""

UNSCREWED = ("free-standing", "laid", "leaning")
"""Mountings that leave no hole, for rented rooms."""


@dataclass(frozen=True, slots=True)
class Product:
    """One thing that can be bought."""

    id: str
    description: str
    unit: Unit
    width: float | None
    """Of one piece. [m]"""
    height: float | None
    """Of one piece. [m]"""
    thickness_mm: float | None
    """[mm]"""
    gap_mm: float | None
    """Air behind it. [mm]"""
    mounting: str
    """``direct``, ``gap``, ``hung``, ``laid``, ``leaning``, ``free-standing`` …"""
    surfaces: tuple[str, ...]
    """What it may go on: ``wall``, ``ceiling``, ``floor``, ``free``."""
    pack: float
    """Pieces or items in a pack; for ``m2`` square metres in a pack."""
    price_per_pack: float | None
    currency: str
    """Empty: the room's own."""
    weight_kg: float | None
    """Of one piece or item, or of one square metre. [kg]"""
    fire_class_declared: str
    coefficients: Coefficients
    """Per square metre; for ``item`` the absorption area of one. [-] or [m²]"""
    source: str = ""
    note: str = ""
    build_up: tuple[dict[str, Any], ...] | None = None
    """Its layers from the front to the wall, where it is described by them."""

    @property
    def piece_area(self) -> float:
        """Face of one piece, 1 for goods by the square metre, 0 for free-standing things. [m²]."""
        if self.unit == "m2":
            return 1.0
        if self.unit == "item":
            return 0.0
        assert self.width is not None
        assert self.height is not None
        return self.width * self.height

    @property
    def depth_mm(self) -> float | None:
        """Thickness and gap together; None where the thickness is not given. [mm]."""
        if self.thickness_mm is None:
            return None
        return self.thickness_mm + (self.gap_mm or 0.0)

    @property
    def needs_fixings(self) -> bool:
        """Is it screwed to something."""
        return self.unit != "item" and self.mounting not in UNSCREWED

    @property
    def price_is_invented(self) -> bool:
        """Does its row say that the price is made up."""
        return "invented" in f"{self.source} {self.note}".lower()


class Catalogue(Mapping[str, Product]):
    """Products by id, in the order of the file."""

    def __init__(self, products: Iterable[Product], *, file: str | None = None) -> None:
        self._products: dict[str, Product] = {}
        self.file = file
        """Name of the file it came from; None for the built-in one."""
        for product in products:
            if product.id in self._products:
                raise CatalogueError(
                    f"the id {product.id!r} is used twice", file=file, cure="Rename one."
                )
            self._products[product.id] = product

    def __getitem__(self, product_id: str) -> Product:
        return self._products[product_id]

    def __iter__(self) -> Iterator[str]:
        return iter(self._products)

    def __len__(self) -> int:
        return len(self._products)

    def find(self, product_id: str) -> Product:
        """The product of that id.

        Raises
        ------
        CatalogueError
            There is none; the nearest ids are named.
        """
        try:
            return self._products[product_id]
        except KeyError:
            near = get_close_matches(product_id, self._products, n=3, cutoff=0.5)
            known = near or list(self._products)[:5]
            raise CatalogueError(
                f"there is no product {product_id!r}",
                file=self.file or "the built-in catalogue",
                cure=f"{'Nearest' if near else 'It begins with'}: {', '.join(known)}.",
            ) from None

    @property
    def is_priced(self) -> bool:
        """Has any product a price."""
        return any(product.price_per_pack is not None for product in self.values())


def read_catalogue(path: str | Path) -> Catalogue:
    """Read a catalogue of one's own.

    Parameters
    ----------
    path
        CSV with the columns of the guide; comma, semicolon or tab between cells, UTF-8 (with or
        without byte-order mark), UTF-16 with one, or Windows-1252. Lines before the headings that
        begin with ``#`` are remarks.

    Returns
    -------
    catalogue
        In SI units.

    Raises
    ------
    CatalogueError
        The file cannot be read or used; row and column are named.
    """
    from planner.treat.catalogue_file import products_from_bytes

    file = Path(path)
    try:
        raw = file.read_bytes()
    except OSError as error:
        raise CatalogueError(
            f"cannot be read ({error.strerror or error})",
            file=file,
            cure="Name a CSV file with products.",
        ) from error
    return Catalogue(products_from_bytes(raw, file=file.name), file=file.name)


@functools.cache
def builtin_catalogue() -> Catalogue:
    """The generic products shipped with the planner; their prices are invented."""
    from planner.treat.catalogue_file import products_from_bytes

    here = Path(__file__).resolve()
    # In a checkout the tables lie beside the package, in a wheel inside it.
    folders = (here.parents[2] / "materials", here.parents[1] / "_materials")
    file = next(f / "catalogue.csv" for f in folders if (f / "catalogue.csv").is_file())
    return Catalogue(products_from_bytes(file.read_bytes(), file="catalogue.csv"))
