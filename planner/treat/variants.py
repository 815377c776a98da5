"""Thickness and gap as choices: one row of a catalogue that stands for several products.

A row with a ``build_up`` may hold several values in ``thickness_mm`` and ``gap_mm``, with strokes
between them: ``50/100`` and ``0/50/100``. In the layers the words ``"thickness"`` and ``"gap"``
under a key that ends in ``_mm`` stand for the value at hand; a layer of 0 mm is left out. ``price_per_pack`` and
``weight_kg`` hold one value, or one for each thickness.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import product
from typing import Any

from planner.treat.cells import Row, number_of

MOST_VARIANTS = 40
"""Of one row."""


def variants(row: Row) -> list[Row]:
    """The rows that a row stands for: itself, or one for each thickness and gap.

    Raises
    ------
    CatalogueError
        Several values without a build-up, or prices that do not match the thicknesses.
    """
    thicknesses, gaps = _several(row, "thickness_mm"), _several(row, "gap_mm")
    if len(thicknesses) == 1 and len(gaps) == 1:
        return [row]
    column = "thickness_mm" if len(thicknesses) > 1 else "gap_mm"
    if not row.cells.get("build_up"):
        raise row.wrong(
            column,
            f"{row.cells[column]!r} is more than one value",
            "Only a row with a build_up may offer several; coefficients hold for one.",
        )
    if len(thicknesses) * len(gaps) > MOST_VARIANTS:
        raise row.wrong(column, f"makes more than {MOST_VARIANTS} products", "Offer fewer.")
    prices = _matched(row, "price_per_pack", len(thicknesses))
    weights = _matched(row, "weight_kg", len(thicknesses))
    rows = []
    for (number, thickness), gap in product(enumerate(thicknesses), gaps):
        changes = {
            "id": f"{row.cells.get('id', '')}@{thickness or '-'}+{gap or '0'}",
            "description": _described(row, thickness, gap),
            "thickness_mm": thickness,
            "gap_mm": gap,
            "price_per_pack": prices[number],
            "weight_kg": weights[number],
        }
        rows.append(replace(row, cells={**row.cells, **changes}))
    return rows


def filled_in(row: Row, layers: Sequence[dict[str, Any]]) -> list[dict[str, Any]]:
    """Layers with the words ``thickness`` and ``gap`` replaced by this row's values in mm.

    Raises
    ------
    CatalogueError
        A word is used for which the row has no number.
    """
    filled = []
    for layer in layers:
        values = dict(layer)
        empty = False
        for key, value in layer.items():
            if key.endswith("_mm") and value in ("thickness", "gap"):
                column = f"{value}_mm"
                number = number_of(row.cells.get(column, ""), decimal_comma=row.decimal_comma)
                if number is None:
                    raise row.wrong(column, "is empty, and the build-up asks for it", "Fill it.")
                values[key] = number
                empty = empty or number == 0.0
        if not empty:
            filled.append(values)
    return filled


def _several(row: Row, column: str) -> list[str]:
    return [part.strip() for part in row.cells.get(column, "").split("/")]


def _matched(row: Row, column: str, count: int) -> list[str]:
    values = _several(row, column)
    if len(values) == 1:
        return values * count
    if len(values) != count:
        raise row.wrong(
            column,
            f"{len(values)} values for {count} thicknesses",
            "Write one for each thickness, or one for all.",
        )
    return values


def _described(row: Row, thickness: str, gap: str) -> str:
    words = row.cells.get("description", "") or row.cells.get("id", "")
    if thickness:
        words += f", {thickness} mm"
    number = number_of(gap, decimal_comma=row.decimal_comma)
    return f"{words}, {gap} mm off the wall" if number else words
