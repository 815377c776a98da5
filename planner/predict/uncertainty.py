"""How sure a prediction is: a seeded Monte Carlo over everything that is not known exactly."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.air import Air, energy_attenuation, speed_of_sound
from planner.bands import OCTAVES, exact_midband
from planner.predict.formulas import Inputs, inputs_of
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

TEMPERATURE_U = 1.0
"""Standard uncertainty of the air temperature; a judgement. [K]"""

HUMIDITY_U = 5.0
"""Standard uncertainty of the relative humidity; a judgement. [%]"""

LARGEST_DRAWN = 1.3
"""Laboratory coefficients reach this. [-]"""


@dataclass(frozen=True, slots=True)
class Draws:
    """Seeded variants of a room, and the numbers that made them."""

    room: Inputs
    """With a leading axis ``(draw,)``."""
    factors: dict[str, Array]
    """What was drawn for each input, shape ``(draw, band)`` or ``(draw, 1)``, standardised."""


def draw(surfaces: RoomSurfaces, air: Air, count: int, seed: int) -> Draws:
    """Variants of a room within what is known of it.

    Parameters
    ----------
    surfaces
        The room; `u` of its coefficients, `item_u` and `dimension_u` are standard uncertainties.
    air
        State of the air, known to 1 K and 5 % relative humidity.
    count
        Number of variants.
    seed
        The same seed gives the same variants.

    Notes
    -----
    One number per material and band: every part made of a material is off by as much. Coefficients
    are normal, kept within 0 and 1.3. Length, width and height stretch the room along its axes;
    openings, patches and panels keep their size, so that the bare surfaces take the change.
    """
    rng = np.random.default_rng(seed)
    bands = len(OCTAVES)
    factors: dict[str, Array] = {}
    standard = rng.standard_normal((count, len(surfaces.materials), bands))
    for number, name in enumerate(surfaces.materials):
        factors[name] = standard[:, number]
    alpha = surfaces.alpha + standard[:, surfaces.material_index] * surfaces.u
    np.clip(alpha, 0.0, np.maximum(LARGEST_DRAWN, surfaces.alpha), out=alpha)

    item_total = np.broadcast_to(surfaces.item_count @ surfaces.item_area, (count, bands)).copy()
    for number, name in enumerate(surfaces.items):
        factor = rng.standard_normal((count, bands))
        factors[name] = factors.get(name, 0.0) + factor
        item_total += surfaces.item_count[number] * factor * surfaces.item_u[number]
    np.maximum(item_total, 0.0, out=item_total)

    lengths = rng.standard_normal((count, 3))
    factors["dimensions"] = lengths.sum(axis=1, keepdims=True)
    stretch = 1.0 + lengths * surfaces.dimension_u / np.maximum(surfaces.dimensions, 0.1)

    weather = rng.standard_normal((count, 2))
    factors["air temperature"], factors["air humidity"] = weather[:, :1], weather[:, 1:]
    temperature = air.temperature_c + TEMPERATURE_U * weather[:, :1]
    humidity = np.clip(air.humidity_percent + HUMIDITY_U * weather[:, 1:], 1.0, 100.0)

    still = inputs_of(surfaces, air)
    room = replace(
        still,
        volume=still.volume * stretch.prod(axis=1),
        area=_stretched(surfaces, still.normal, stretch),
        alpha=alpha,
        item_area=item_total,
        air_attenuation=energy_attenuation(
            exact_midband(OCTAVES), temperature, humidity, air.pressure_kpa
        ),
        speed=speed_of_sound(temperature[:, 0]),
    )
    return Draws(room, factors)


def _stretched(surfaces: RoomSurfaces, normal: Array, stretch: Array) -> Array:
    """Areas of the parts in a room stretched along its axes, shape ``(draw, part)``. [m²]."""
    # A level surface grows with both plan axes; a wall with the height and with its own run.
    level = np.abs(normal[:, 2]) > 0.5
    run = np.sqrt((stretch[:, None, :2] ** 2 * normal[None, :, 1::-1] ** 2).sum(axis=-1))
    factor = np.where(level, (stretch[:, 0] * stretch[:, 1])[:, None], run * stretch[:, 2:])
    gross = np.array([surfaces.area_on(part.on) for part in surfaces.parts])
    base = np.array([part.kind == "base" for part in surfaces.parts])
    changed = surfaces.area + np.where(base, (factor - 1.0) * gross, 0.0)
    return np.maximum(changed, 0.0)


def contributions(times: Array, factors: dict[str, Array]) -> dict[str, Array]:
    """Share of each input in the variance of the reverberation time.

    Parameters
    ----------
    times
        Shape ``(draw, band)``. [s]
    factors
        As drawn, see `Draws`.

    Returns
    -------
    shares
        Squared correlation of each input with the time, shape ``(band,)``; what several inputs
        only do together is left over. [-]
    """
    centred = times - times.mean(axis=0)
    spread = np.sqrt(np.mean(centred**2, axis=0))
    shares = {}
    for name, factor in factors.items():
        other = factor - factor.mean(axis=0)
        with np.errstate(divide="ignore", invalid="ignore"):
            together = np.mean(centred * other, axis=0)
            share = (together / (spread * np.sqrt(np.mean(other**2, axis=0)))) ** 2
        shares[name] = np.nan_to_num(share)
    return shares
