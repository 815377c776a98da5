"""``catalogue.csv`` → products. Every refusal names the row, the column and what would be right."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any, cast

import numpy as np

from planner.absorption.library import (
    Coefficients,
    Material,
    builtin,
    coefficients,
    material_from_values,
)
from planner.bands import OCTAVES
from planner.errors import CatalogueError, InputError, MaterialError
from planner.treat.catalogue import FREE, Product, Unit
from planner.treat.cells import Row, decoded, number_of, rows_of
from planner.treat.variants import filled_in, variants

FEWEST_BANDS = 3
"""Coefficients needed; a single-number rating does not say what happens in a band."""

BAND_COLUMNS = tuple(f"a{hz}" for hz in OCTAVES)
COLUMNS = (
    "id", "description", "unit", "width_m", "height_m", "thickness_mm", "gap_mm", "mounting",
    "surfaces", "pack", "price_per_pack", "currency", "weight_kg", "fire_class_declared",
    *BAND_COLUMNS, "u", "material", "build_up", "source", "note",
)  # fmt: skip

_PLACES = ("wall", "ceiling", "floor", FREE)
_UNITS = {
    "": "piece", "piece": "piece", "pieces": "piece", "panel": "piece",
    "m2": "m2", "m²": "m2", "sqm": "m2",
    "item": "item", "items": "item",
}  # fmt: skip


def products_from_bytes(raw: bytes, *, file: str) -> list[Product]:
    """Products of a catalogue file.

    Parameters
    ----------
    raw
        The file as it lies on the disk.
    file
        Its name, for messages.

    Raises
    ------
    CatalogueError
        With every wrong row up to the sixth, the first in full.
    """
    rows = rows_of(decoded(raw, file), file, COLUMNS)
    products: list[Product] = []
    wrong: list[CatalogueError] = []
    seen: dict[str, int] = {}
    for row in rows:
        try:
            for one in variants(row):
                product = _product(one)
                if product.id in seen:
                    raise row.wrong(
                        "id",
                        f"{product.id!r} stands in row {seen[product.id]} already",
                        "Rename one.",
                    )
                seen[product.id] = row.number
                products.append(product)
        except CatalogueError as error:
            wrong.append(error)
            if len(wrong) > 5:
                break
    if wrong:
        raise _together(wrong, file)
    if not products:
        raise CatalogueError(
            "holds no product", file=file, cure="Add a row below the headings for each product."
        )
    return products


def _together(wrong: Sequence[CatalogueError], file: str) -> CatalogueError:
    first = wrong[0]
    others = "; ".join(f"{error.where}: {error.what}" for error in wrong[1:])
    cure = f"{first.cure or ''} Also wrong: {others}.".strip() if others else first.cure
    return CatalogueError(first.what, file=file, where=first.where, cure=cure)


def _product(row: Row) -> Product:
    name = row.text("id", 80)
    if not name:
        raise row.wrong("id", "is empty", "Give every product an id of its own.")
    unit = _unit(row)
    material = _material(row, unit)
    width = row.number_in("width_m", 0.05, 20.0, "m", _metres_hint(row, "width_m"))
    height = row.number_in("height_m", 0.05, 20.0, "m", _metres_hint(row, "height_m"))
    for column, value in (("width_m", width), ("height_m", height)):
        if unit == "piece" and value is None:
            raise row.wrong(
                column, "is empty", "Give the size of one piece, or write m2 under unit."
            )
    thickness = row.number_in("thickness_mm", 0.0, 2000.0, "mm")
    gap = row.number_in("gap_mm", 0.0, 3000.0, "mm")
    _agree(row, material, thickness, gap)
    price = row.number_in("price_per_pack", 0.0, 1e7, "")
    return Product(
        id=name,
        description=row.text("description") or (material.description if material else "") or name,
        unit=unit,
        width=width,
        height=height,
        thickness_mm=thickness
        if thickness is not None
        else getattr(material, "thickness_mm", None),
        gap_mm=gap if gap is not None else getattr(material, "gap_mm", None),
        mounting=row.text("mounting", 60).lower()
        or (material.mounting if material else "")
        or {"piece": "direct", "m2": "direct", "item": "free-standing"}[unit],
        surfaces=_surfaces(row, unit),
        pack=_pack(row, unit),
        price_per_pack=price,
        currency=row.text("currency", 8).upper(),
        weight_kg=row.number_in("weight_kg", 0.0, 2000.0, "kg"),
        fire_class_declared=row.text("fire_class_declared", 80),
        coefficients=_values(row, unit, material),
        source=row.text("source"),
        note=row.text("note"),
        build_up=_layers(row) if row.cells.get("build_up") else None,
    )


def _metres_hint(row: Row, column: str) -> str:
    value = number_of(row.cells.get(column, ""), decimal_comma=row.decimal_comma)
    if value is not None and 50 <= value <= 20_000:
        return f"In metres, {value:g} mm are {value / 1000:g}."
    return ""


def _unit(row: Row) -> Unit:
    text = row.text("unit", 20).lower()
    if text not in _UNITS:
        raise row.wrong("unit", f"{text!r} is no unit of sale", "Use piece, m2 or item.")
    return cast(Unit, _UNITS[text])


def _surfaces(row: Row, unit: Unit) -> tuple[str, ...]:
    words = [word for word in re.split(r"[;,|/\s]+", row.text("surfaces", 80).lower()) if word]
    if not words:
        return (FREE,) if unit == "item" else ("wall", "ceiling")
    for index, word in enumerate(words):
        word = word if word in _PLACES else word.removesuffix("s")
        if word not in _PLACES:
            raise row.wrong(
                "surfaces", f"{word!r} is no kind of surface", "Use wall; ceiling; floor; free."
            )
        words[index] = word
    if (FREE in words) != (unit == "item") or (unit == "item" and len(set(words)) > 1):
        raise row.wrong(
            "surfaces",
            f"{'; '.join(words)} does not go with the unit {unit}",
            "Free-standing things have the unit item and the surface free, and no others.",
        )
    return tuple(dict.fromkeys(words))


def _pack(row: Row, unit: Unit) -> float:
    pack = row.number_in("pack", 0.0, 100_000.0, "")
    if pack is None:
        return 1.0
    if unit != "m2" and (pack < 1 or pack != round(pack)):
        raise row.wrong("pack", f"{pack:g} pieces make no pack", "Write a whole number from 1.")
    if pack <= 0:
        raise row.wrong("pack", "an empty pack", "Write how many square metres it holds.")
    return pack


def _material(row: Row, unit: Unit) -> Material | None:
    """The row of the material library that this product is made of, where it names one."""
    name = row.text("material", 80)
    given = [column for column in BAND_COLUMNS if row.cells.get(column)]
    ways = [bool(given), bool(name), bool(row.cells.get("build_up"))]
    if sum(ways) != 1:
        raise row.wrong(
            BAND_COLUMNS[0],
            "neither coefficients nor a material nor a build-up are given"
            if not any(ways)
            else "coefficients are given in more than one way",
            "Fill the columns a63 … a8000, or material, or build_up.",
        )
    if not name:
        return None
    try:
        material = builtin().find(name)
    except InputError as error:
        raise row.wrong("material", error.what, error.cure) from error
    if material.per_item != (unit == "item"):
        raise row.wrong(
            "material",
            f"{name!r} is given per {'item' if material.per_item else 'square metre'}",
            "Write item under unit for things counted in pieces that cover no surface.",
        )
    return material


def _agree(row: Row, material: Material | None, thickness: float | None, gap: float | None) -> None:
    """Coefficients hold for one thickness and one gap: refuse them at another."""
    if material is None:
        return
    for column, value, tabled in (
        ("thickness_mm", thickness, material.thickness_mm),
        ("gap_mm", gap, material.gap_mm),
    ):
        if value is not None and tabled is not None and value != tabled:
            raise row.wrong(
                column,
                f"{material.id!r} was measured with {tabled:g} mm, not {value:g} mm",
                "Leave the cell empty, name another material, or describe it under build_up.",
            )


def _values(row: Row, unit: Unit, material: Material | None) -> Coefficients:
    try:
        if material is not None:
            return coefficients(material)
        if row.cells.get("build_up"):
            return coefficients(_from_layers(row))
        own = material_from_values(
            row.cells["id"],
            _alpha(row, unit),
            u=_uncertainty(row),
            description=row.cells.get("description", ""),
            source=row.cells.get("source", "") or "catalogue",
            per_item=unit == "item",
        )
        return coefficients(own)
    except CatalogueError:
        raise
    except InputError as error:
        raise row.wrong(BAND_COLUMNS[0], error.what, error.cure) from error


def _layers(row: Row) -> tuple[dict[str, Any], ...]:
    from planner.absorption.build_up_text import layers_from_text

    try:
        layers = layers_from_text(row.text("build_up", 2000))
    except MaterialError as error:
        raise _wrong_layers(row, error) from error
    return tuple(filled_in(row, layers))


def _wrong_layers(row: Row, error: InputError) -> CatalogueError:
    layer = (error.where or "").rpartition(", ")[2]
    what = f"{layer} {error.what}" if layer.startswith("layer ") else error.what
    return row.wrong("build_up", what, error.cure)


def _from_layers(row: Row) -> Material:
    layers = _layers(row)
    from planner.absorption.build_up import material_from_build_up

    try:
        return material_from_build_up(row.cells["id"], row.cells.get("description", ""), layers)
    except MaterialError as error:
        raise _wrong_layers(row, error) from error


def _alpha(row: Row, unit: Unit) -> dict[int, float]:
    values: dict[int, float] = {}
    for hz, column in zip(OCTAVES, BAND_COLUMNS, strict=True):
        text = row.cells.get(column, "")
        most = 20.0 if unit == "item" else 1.6
        hint = "Leave the cell empty where nothing is known." if text.startswith("-") else ""
        number = number_of(text, decimal_comma=row.decimal_comma)
        if unit != "item" and number is not None and 1.6 < number <= 160:
            hint = f"Coefficients are no percent: write {number / 100:g}."
        value = row.number_in(column, 0.0, most, "m²" if unit == "item" else "", hint)
        if value is not None:
            values[hz] = value
    if len(values) < FEWEST_BANDS:
        raise row.wrong(
            BAND_COLUMNS[0],
            f"coefficients in {len(values)} band(s) do not describe an absorber",
            f"Give at least {FEWEST_BANDS}; a single-number rating cannot be used.",
        )
    return values


def _uncertainty(row: Row) -> float | dict[int, float] | None:
    cell = row.text("u", 120)
    if not cell:
        return None
    words = re.split(r"[;|\s]+", cell)
    numbers = [number_of(word, decimal_comma=row.decimal_comma) for word in words]
    values = np.array([np.nan if number is None else number for number in numbers])
    if len(values) not in (1, len(OCTAVES)) or not np.all((values >= 0) & (values <= 1)):
        raise row.wrong(
            "u",
            f"{cell[:40]!r} is no standard uncertainty",
            f"Write one number from 0 to 1, or {len(OCTAVES)} with spaces between them.",
        )
    if len(values) == 1:
        return float(values[0])
    return dict(zip(OCTAVES, values.tolist(), strict=True))
