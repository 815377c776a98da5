"""How likely a treatment meets its target, given what nobody knows exactly.

The room is drawn as `planner.predict.uncertainty.draw` does for a prediction: coefficients of the
room (or, after a calibration, its posterior), of the products, dimensions and air. A draw meets the
target when every judged band lies inside it by every formula that must meet it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from planner.air import Air
from planner.bands import OCTAVES
from planner.errors import OptionError
from planner.predict.formulas import reverberation_time
from planner.predict.targets import TargetLimits
from planner.predict.uncertainty import draw
from planner.room.surfaces import RoomSurfaces
from planner.treat.windows import area_behind

Array = NDArray[np.float64]

STEERING_DRAWS = 4000
"""Draws that a search for a confidence is judged by: sampling error 0.8 % at most."""


def time_draws(
    surfaces: RoomSurfaces,
    air: Air,
    names: Sequence[str],
    *,
    count: int,
    seed: int,
    room_draws: Array | None = None,
    item_draws: Array | None = None,
) -> dict[str, Array]:
    """Reverberation times of a treated room, drawn from what is not known of it.

    Parameters
    ----------
    surfaces, air
        The room, treated; state of the air.
    names
        Formulas.
    count, seed
        How many draws; same seed, same draws.
    room_draws
        Draws of the untreated room's coefficients, shape ``(draw, part, band)``, from a
        calibration; those parts come first in `surfaces`. Products are still drawn from their own
        uncertainty. [-]
    item_draws
        Draws of the furnishings that came with `room_draws`, row by row, shape
        ``(draw, item, band)``; those furnishings come first in `surfaces`. [m²]

    Returns
    -------
    times
        By formula, shape ``(draw, band)``. [s]

    Raises
    ------
    OptionError
        `room_draws` does not fit the room.
    """
    room = draw(surfaces, air, count, seed).room
    if room_draws is not None:
        untreated = sum(part.kind != "panel" for part in surfaces.parts)
        given = _fitting(np.asarray(room_draws, float), untreated, "parts")
        generator = np.random.default_rng(seed + 7919)
        rows = generator.integers(len(given), size=count)
        alpha = room.alpha.copy()
        alpha[:, :untreated] = given[rows]
        room = replace(room, alpha=alpha)
        if item_draws is not None:
            room = replace(room, item_area=_items(surfaces, item_draws, rows, generator))
    return {name: reverberation_time(name, room) for name in names}


def _fitting(draws: Array, count: int, what: str) -> Array:
    if draws.ndim != 3 or draws.shape[1:] != (count, len(OCTAVES)) or len(draws) < 1:
        raise OptionError(
            f"draws of shape {draws.shape} do not fit a room of {count} {what}",
            cure=f"Give an array (draw, {count}, {len(OCTAVES)}).",
        )
    return draws


def _items(
    surfaces: RoomSurfaces, draws: Array, rows: NDArray[np.intp], generator: np.random.Generator
) -> Array:
    """Absorption area of furnishings as drawn and of free-standing products, ``(draw, band)``."""
    given = np.asarray(draws, float)
    if given.ndim != 3 or given.shape[1] > len(surfaces.items) or rows.max() >= len(given):
        raise OptionError(
            f"draws of shape {given.shape} do not fit a room of {len(surfaces.items)} furnishings",
            cure="Give an array (draw, furnishing, band) of as many draws as of the surfaces.",
        )
    old = given.shape[1]
    area: Array = np.einsum("i,dib->db", surfaces.item_count[:old], given[rows])
    for number in range(old, len(surfaces.items)):
        error = generator.standard_normal(area.shape) * surfaces.item_u[number]
        area += surfaces.item_count[number] * np.maximum(surfaces.item_area[number] + error, 0.0)
    return area


def meets(
    times: dict[str, Array], target: TargetLimits, judged: NDArray[np.bool_]
) -> NDArray[np.bool_]:
    """Which draws lie inside the target, shape ``(draw, band)``; bands not judged always do."""
    low = np.where(judged & np.isfinite(target.low), target.low, 0.0)
    high = np.where(judged & np.isfinite(target.high), target.high, np.inf)
    inside = [(drawn >= low) & (drawn <= high) for drawn in times.values()]
    result: NDArray[np.bool_] = np.all(inside, axis=0)
    return result


def area_spread(
    surfaces: RoomSurfaces, air: Air, times: dict[str, Array]
) -> dict[str, tuple[Array, Array]]:
    """Mean and standard deviation of the absorption area that would give the drawn times.

    By formula, shape ``(band,)`` each, in the room of nominal size and air. [m²]
    """
    spread = {}
    for name, drawn in times.items():
        areas = area_behind(name, drawn, surfaces, air)
        spread[name] = (areas.mean(axis=0), areas.std(axis=0))
    return spread
