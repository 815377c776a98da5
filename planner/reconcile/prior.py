"""What is believed about a room's coefficients before it is measured."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.predict.reverberation import LARGEST_ALPHA
from planner.reconcile.posterior import BoxedNormal
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

BANDS = len(OCTAVES)

LARGEST_COEFFICIENT = 1.3
"""Laboratory values reach this; a larger coefficient is not physical. [-]"""

SMALLEST_U = 0.005
"""No coefficient is known better than this (a judgement, no source). [-]"""

NEIGHBOUR_CORRELATION = 0.6
"""Correlation of the errors of one material in neighbouring octaves, its power n for n octaves
(a judgement, no source): a mounting or thickness that is off is off in neighbours too. [-]"""

UNEXPLAINED_SHARE = 0.05
"""Standard uncertainty of what no list holds (gaps, cables, shelves), of the room's area. [-]"""

UNEXPLAINED_MEAN = 0.005
"""And as a mean coefficient over all surfaces. [-]"""

UNEXPLAINED = "unexplained"
"""Name of the absorption that no listed surface or furnishing explains."""


@dataclass(frozen=True, slots=True)
class Unknown:
    """One material, furnishing or the unexplained rest, with what is believed about it."""

    name: str
    """Material or furnishing id, or `UNEXPLAINED`."""
    kind: str
    """``material``, ``item`` or ``unexplained``."""
    amount: float
    """Area of a material [m²], count of a furnishing [-], 1 for the rest."""
    value: Array
    """Prior, shape ``(band,)``: coefficient [-], or absorption area of one piece [m²]."""
    u: Array
    """Its standard uncertainty, shape ``(band,)``."""
    lower: Array
    upper: Array
    assumed: NDArray[np.bool_]
    """Bands without a source, shape ``(band,)``."""


def unknowns(surfaces: RoomSurfaces, formula: str) -> tuple[Unknown, ...]:
    """One unknown for each distinct material and furnishing, and the unexplained rest, last.

    A material has the same coefficients wherever it is: two surfaces of one material are one
    unknown. The rest begins at 0 and may become negative, down to half of the room's absorption
    area: a formula may also be short, and a rest that could only grow would pull every
    coefficient down.
    """
    rows = [_material(surfaces, name) for name in surfaces.materials]
    rows += [_item(surfaces, group) for group in item_groups(surfaces)]
    area = np.zeros(BANDS)
    for row in rows:
        area += row.amount * counted(row.value, formula) if row.kind == "material" else 0.0
        area += row.amount * row.value if row.kind == "item" else 0.0
    return (*rows, _rest(surfaces, area))


def counted(alpha: Array, formula: str) -> Array:
    """Coefficients as a formula counts them: capped for Eyring. [-]."""
    return np.minimum(alpha, LARGEST_ALPHA) if formula == "eyring" else alpha


def _material(surfaces: RoomSurfaces, name: str) -> Unknown:
    parts = [n for n, part in enumerate(surfaces.parts) if part.material == name]
    alpha = surfaces.alpha[parts[0]]
    return Unknown(
        name=name,
        kind="material",
        amount=float(surfaces.area[parts].sum()),
        value=alpha,
        u=np.maximum(surfaces.u[parts[0]], SMALLEST_U),
        lower=np.zeros(BANDS),
        upper=np.maximum(LARGEST_COEFFICIENT, alpha),
        assumed=surfaces.assumed[parts[0]],
    )


def item_groups(surfaces: RoomSurfaces) -> list[list[int]]:
    """Entries of the furnishings that are one thing: same name and same absorption area."""
    groups: list[list[int]] = []
    for number, name in enumerate(surfaces.items):
        for group in groups:
            first = group[0]
            same = np.array_equal(surfaces.item_area[first], surfaces.item_area[number])
            if surfaces.items[first] == name and same:
                group.append(number)
                break
        else:
            groups.append([number])
    return groups


def _item(surfaces: RoomSurfaces, group: list[int]) -> Unknown:
    first = group[0]
    return Unknown(
        name=surfaces.items[first],
        kind="item",
        amount=float(surfaces.item_count[group].sum()),
        value=surfaces.item_area[first],
        u=np.maximum(surfaces.item_u[first], SMALLEST_U),
        lower=np.zeros(BANDS),
        upper=np.full(BANDS, np.inf),
        assumed=surfaces.item_assumed[first],
    )


def _rest(surfaces: RoomSurfaces, area: Array) -> Unknown:
    """What no list holds, beside an absorption area that is listed."""
    size = surfaces.surface_area
    return Unknown(
        name=UNEXPLAINED,
        kind="unexplained",
        amount=1.0,
        value=np.zeros(BANDS),
        u=UNEXPLAINED_SHARE * area + UNEXPLAINED_MEAN * size,
        lower=-0.5 * area - UNEXPLAINED_MEAN * size,
        upper=np.full(BANDS, size),
        assumed=np.zeros(BANDS, bool),
    )


def prior_of(rows: Sequence[Unknown]) -> BoxedNormal:
    """Independent unknowns, each smooth over neighbouring bands."""
    steps = np.abs(np.subtract.outer(np.arange(BANDS), np.arange(BANDS)))
    smooth = NEIGHBOUR_CORRELATION**steps
    size = len(rows) * BANDS
    covariance = np.zeros((size, size))
    for number, row in enumerate(rows):
        here = slice(number * BANDS, (number + 1) * BANDS)
        covariance[here, here] = smooth * np.outer(row.u, row.u)
    return BoxedNormal(
        mean=np.concatenate([row.value for row in rows]),
        covariance=covariance,
        lower=np.concatenate([row.lower for row in rows]),
        upper=np.concatenate([row.upper for row in rows]),
    )


def carried_over(
    rows: Sequence[Unknown], earlier_rows: Sequence[Unknown], earlier: BoxedNormal
) -> BoxedNormal:
    """The prior of a room of which an earlier state was measured.

    What both states have in common (same id, and for furnishings the same size) begins where the earlier calibration ended, with its
    correlations; what is new begins with its table values.
    """
    fresh = prior_of(rows)
    places = {_identity(row): number for number, row in enumerate(earlier_rows)}
    known = [
        (number, places[_identity(row)])
        for number, row in enumerate(rows)
        if _identity(row) in places
    ]
    if not known:
        return fresh
    bands = np.arange(BANDS)
    here = np.concatenate([number * BANDS + bands for number, _ in known])
    there = np.concatenate([number * BANDS + bands for _, number in known])
    mean, covariance = fresh.mean.copy(), fresh.covariance.copy()
    mean[here] = earlier.mean[there]
    covariance[np.ix_(here, here)] = earlier.covariance[np.ix_(there, there)]
    return BoxedNormal(mean, covariance, fresh.lower, fresh.upper)


def _identity(row: Unknown) -> tuple[str, str, tuple[float, ...]]:
    """What makes two unknowns the same: hard objects share a name, not a size."""
    return row.kind, row.name, tuple(row.value.tolist()) if row.kind == "item" else ()
