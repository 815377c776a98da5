"""Materials: the tables in ``materials/``, look-up with hints, and complete coefficients."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from functools import cache
from importlib.resources import files
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.absorption.tables import Row, band_heading, read_table
from planner.absorption.uncertainty import (
    ASSUMED_SHARE,
    filled,
    item_uncertainty,
    table_uncertainty,
)
from planner.bands import OCTAVES
from planner.errors import MaterialError

LARGEST_ALPHA = 1.6
"""A coefficient beyond this is taken for percent; laboratory values reach 1.3. [-]"""

FEWEST_BANDS = 3
"""Bands needed; a single-number rating does not say what happens in a band."""

TABLES = {"surfaces": False, "treatments": False, "furnishings": True}
"""The files of materials, and whether they count per item."""

COLUMNS = (
    "id", "description", "category", "mounting", "thickness_mm", "gap_mm",
    *(f"a{hz}" for hz in OCTAVES), "u", "source", "place_in_source", "note",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Material:
    """One row of a table: a surface or treatment per square metre, or a furnishing per item."""

    id: str
    description: str
    category: str
    mounting: str
    thickness_mm: float | None
    """[mm]"""
    gap_mm: float | None
    """Air behind it. [mm]"""
    alpha: tuple[float | None, ...]
    """Per octave as printed, None where the source gives none. [-], or [m²] per item"""
    u: tuple[float | None, ...]
    """Standard uncertainty per octave where one is given."""
    source: str
    """Key in ``sources.csv``, or words."""
    place_in_source: str
    note: str
    per_item: bool = False

    @property
    def basis(self) -> str:
        """Where its numbers come from: ``table``, ``estimated`` or ``own``."""
        if self.category == "build-up" or self.note.startswith("estimated"):
            return "estimated"
        return "own" if self.category == "own" else "table"


@dataclass(frozen=True, slots=True)
class Coefficients:
    """Complete coefficients of one material over the octaves, shape ``(band,)`` each."""

    alpha: NDArray[np.float64]
    """[-], or absorption area per item [m²]"""
    u: NDArray[np.float64]
    """Standard uncertainty."""
    assumed: NDArray[np.bool_]
    """Where no source gives a value."""


def coefficients(material: Material) -> Coefficients:
    """Coefficients with nothing missing: see ``materials/README.md`` for the rules.

    Raises
    ------
    MaterialError
        Fewer than three bands are given.
    """
    given = np.array([np.nan if value is None else value for value in material.alpha], float)
    if np.isfinite(given).sum() < FEWEST_BANDS:
        raise _too_few(material.id, int(np.isfinite(given).sum()))
    alpha, assumed = filled(given)
    rule = item_uncertainty(alpha) if material.per_item else table_uncertainty(alpha)
    own = np.array([np.nan if value is None else value for value in material.u], float)
    u = np.where(np.isnan(own), rule, own)
    u = np.where(assumed, np.hypot(u, ASSUMED_SHARE * alpha), u)
    return Coefficients(alpha=alpha, u=u, assumed=assumed)


Bandwise = Mapping[int, float] | Mapping[str, float]
"""Values by nominal octave midband: ``{125: 0.2}``, or as a file has its keys: ``{"125": 0.2}``."""


def material_from_values(
    material_id: str,
    alpha: Bandwise,
    *,
    u: float | Bandwise | None = None,
    description: str = "",
    source: str = "",
    category: str = "own",
    mounting: str = "",
    thickness_mm: float | None = None,
    gap_mm: float | None = None,
    note: str = "",
    per_item: bool = False,
) -> Material:
    """Material from coefficients that a person typed.

    Parameters
    ----------
    material_id
        Its name.
    alpha
        By nominal octave midband [Hz] (``125``, ``"125"``, ``"1k"``); per square metre [-] or per
        item [m²].
    u
        Standard uncertainty, one for all bands or by band; None: by rule.

    Raises
    ------
    MaterialError
        A value is no number, negative or looks like percent, a band is no octave, or there are too
        few.
    """
    values = _by_octave(alpha, repr(material_id))
    for hz, value in values.items():
        _check_value(value, f"{material_id!r}, {hz} Hz", per_item)
    if len(values) < FEWEST_BANDS:
        raise _too_few(material_id, len(values))
    if isinstance(u, Mapping):
        given = _by_octave(u, f"{material_id!r}, u")
        uncertainty: tuple[float | None, ...] = tuple(given.get(hz) for hz in OCTAVES)
    else:
        uncertainty = (u,) * len(OCTAVES)
    for doubt in uncertainty:
        _check_doubt(doubt, f"{material_id!r}, u", 100.0 if per_item else 1.0)
    return Material(
        id=material_id,
        description=description,
        category=category,
        mounting=mounting,
        thickness_mm=thickness_mm,
        gap_mm=gap_mm,
        alpha=tuple(values.get(hz) for hz in OCTAVES),
        u=uncertainty,
        source=source,
        place_in_source="",
        note=note,
        per_item=per_item,
    )


def _by_octave(values: Bandwise, where: str) -> dict[int, float]:
    """Values by nominal midband, whatever way the band was written."""
    found: dict[int, float] = {}
    for key, value in values.items():
        band = band_heading(str(key))
        hz = int(band[1:]) if band[1:].isdigit() else 0
        if hz not in OCTAVES:
            known = ", ".join(map(str, OCTAVES))
            raise MaterialError(f"{key!r} is no octave band", where=where, cure=f"Use {known} Hz.")
        if hz in found:
            raise MaterialError(f"{hz} Hz is given twice", where=where)
        found[hz] = value
    return found


def _is_number(value: object) -> bool:
    return isinstance(value, (int, float, np.integer, np.floating)) and not isinstance(value, bool)


def _too_few(material_id: str, count: int) -> MaterialError:
    return MaterialError(
        f"only {count} bands are given",
        where=repr(material_id),
        cure="A single number does not say what happens in a band: give octave values.",
    )


def _check_doubt(doubt: float | None, where: str, most: float) -> None:
    if doubt is not None and not (_is_number(doubt) and 0 <= doubt <= most):
        raise MaterialError(
            f"an uncertainty of {doubt} cannot be",
            where=where,
            cure="Give the standard uncertainty in the coefficient's own unit, such as 0.05.",
        )


def _check_value(value: float, where: str, per_item: bool) -> None:
    if not _is_number(value) or value < 0 or not np.isfinite(value):
        raise MaterialError(
            f"an absorption coefficient of {value} cannot be",
            where=where,
            cure="Write a number from 0 to about 1.3; leave the band out where nothing is known.",
        )
    if value > LARGEST_ALPHA and not per_item:
        raise MaterialError(
            f"an absorption coefficient of {value:g} looks like percent",
            where=where,
            cure=f"Write {value / 100:g} for {value:g} %.",
        )


class Library(Mapping[str, Material]):
    """Materials by id."""

    def __init__(self, materials: Iterable[Material]) -> None:
        self._by_id = {material.id: material for material in materials}

    def __getitem__(self, material_id: str) -> Material:
        return self._by_id[material_id]

    def __iter__(self) -> Iterator[str]:
        return iter(self._by_id)

    def __len__(self) -> int:
        return len(self._by_id)

    def find(self, material_id: str) -> Material:
        """The material of that id.

        Raises
        ------
        MaterialError
            There is none; the nearest ids are named.
        """
        if material_id in self._by_id:
            return self._by_id[material_id]
        near = self.near(material_id)
        hint = f"Did you mean {' or '.join(near)}?" if near else "`planner materials` lists them."
        raise MaterialError(f"there is no material {material_id!r}", cure=hint)

    def near(self, words: str, most: int = 3) -> list[str]:
        """Ids like `words`, by spelling first and by the words of the descriptions after."""
        wanted = words.strip().lower().replace(" ", "-").replace("_", "-")
        found = get_close_matches(wanted, self._by_id, n=most, cutoff=0.6)
        terms = [term for term in wanted.split("-") if len(term) > 2]
        scored = {
            key: sum(term in f"{key} {material.description.lower()}" for term in terms)
            for key, material in self._by_id.items()
        }
        by_words = [key for key in sorted(scored, key=lambda k: -scored[k]) if scored[key]]
        return list(dict.fromkeys([*found, *by_words]))[:most]

    def with_own(self, materials: Iterable[Material]) -> Library:
        """The library with more materials; one of an id that exists replaces it."""
        return Library([*self._by_id.values(), *materials])


def tables_folder() -> Path:
    """Where the tables lie: inside the package in a wheel, beside it in a checkout."""
    package = Path(str(files("planner")))
    shipped = package / "_materials"
    return shipped if shipped.is_dir() else package.parent / "materials"


@cache
def builtin() -> Library:
    """The shipped tables.

    Raises
    ------
    MaterialError
        The installation is damaged.
    """
    folder = tables_folder()
    return Library(
        _material(row, per_item, folder / f"{name}.csv")
        for name, per_item in TABLES.items()
        for row in read_table(folder / f"{name}.csv", COLUMNS, kind=MaterialError)
    )


@cache
def bibliography() -> dict[str, str]:
    """Full reference of each source by its key."""
    rows = read_table(tables_folder() / "sources.csv", ("key", "reference"), kind=MaterialError)
    return {row.text("key"): row.text("reference") for row in rows}


def _material(row: Row, per_item: bool, file: Path) -> Material:
    try:
        alpha = tuple(row.number(f"a{hz}") for hz in OCTAVES)
        uncertainty = row.number("u")
        thickness, gap = row.number("thickness_mm"), row.number("gap_mm")
    except ValueError as error:
        raise MaterialError(str(error), file=file, where=f"line {row.line}") from error
    return Material(
        id=row.text("id"),
        description=row.text("description"),
        category=row.text("category"),
        mounting=row.text("mounting"),
        thickness_mm=thickness,
        gap_mm=gap,
        alpha=alpha,
        u=(uncertainty,) * len(OCTAVES),
        source=row.text("source"),
        place_in_source=row.text("place_in_source"),
        note=row.text("note"),
        per_item=per_item,
    )


def sources_of(materials: Sequence[Material]) -> dict[str, str]:
    """References behind some materials: full where the key is known, the words given otherwise."""
    known = bibliography()
    keys = dict.fromkeys(material.source for material in materials if material.source)
    return {key: known.get(key, key) for key in keys}
