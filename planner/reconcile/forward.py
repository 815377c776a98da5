"""From a measured time back to the absorption area that explains it, with what is not known.

For a given formula this step is exact, and the absorption area is linear in the coefficients: that
is what makes the calibration a bounded linear least-squares problem.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.air import Air, energy_attenuation, speed_of_sound
from planner.bands import OCTAVES, exact_midband
from planner.predict.reverberation import area_from_time, decaying_area, eyring, sabine
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

FORMULA_FLOOR = 0.02
"""Relative standard uncertainty of any diffuse-field formula (a judgement, no source). [-]"""

MODAL_PER_OCTAVE = 0.07
"""Relative standard uncertainty added per octave below the Schroeder frequency, where a few modes
make the decay (a judgement, no source). [-]"""

MODAL_MOST = 0.20
"""Largest of these. [-]"""


@dataclass(frozen=True, slots=True)
class Shell:
    """What of a room stays the same while its coefficients are sought."""

    volume: float
    """Of air: without hard objects (EN 12354-6:2003, formula 3). [m³]"""
    surface_area: float
    """[m²]"""
    speed_of_sound: float
    """[m/s]"""
    air_attenuation: Array
    """Energy attenuation, shape ``(band,)``. [1/m]"""
    size_u: float
    """Relative standard uncertainty of a length of the room. [-]"""

    @property
    def carrier(self) -> dict[str, Any]:
        """The air, as the formulas take it."""
        return {
            "air_attenuation": self.air_attenuation,
            "speed_of_sound": self.speed_of_sound,
        }

    @property
    def air_area(self) -> Array:
        """Absorption area of the air, 4 m V, shape ``(band,)``. [m²]."""
        return 4.0 * self.air_attenuation * self.volume


def shell(surfaces: RoomSurfaces, air: Air) -> Shell:
    """The shell of a room in a given air."""
    sizes = np.array([size for size in surfaces.dimensions if size > 0])
    size_u = surfaces.dimension_u * float(np.sqrt(np.sum(sizes**-2.0))) if sizes.size else 0.0
    return Shell(
        volume=surfaces.volume - surfaces.object_volume,
        surface_area=surfaces.surface_area,
        speed_of_sound=float(speed_of_sound(air.temperature_c)),
        air_attenuation=energy_attenuation(
            exact_midband(OCTAVES), air.temperature_c, air.humidity_percent, air.pressure_kpa
        ),
        size_u=size_u,
    )


def time_of(room: Shell, area: ArrayLike, formula: str) -> Array:
    """Reverberation time of an absorption area by ``sabine`` or ``eyring``.

    Parameters
    ----------
    room
        The shell.
    area
        Equivalent absorption area as the formula counts it, shape ``(..., band)``. [m²]
    formula
        ``sabine`` or ``eyring``.

    Returns
    -------
    time
        Shape of `area`; inf without any absorption. [s]

    References
    ----------
    .. [1] W. C. Sabine, *Collected Papers on Acoustics*. Harvard Univ. Press, 1922.
    .. [2] C. F. Eyring, "Reverberation time in 'dead' rooms", JASA 1 (1930) 217.
    """
    values = np.maximum(np.asarray(area, float), 0.0)
    if formula == "eyring":
        mean = values / room.surface_area
        return eyring(room.volume, room.surface_area, mean, **room.carrier)
    return sabine(room.volume, values, **room.carrier)


def area_of(room: Shell, time: ArrayLike, formula: str) -> Array:
    """Absorption area of the surfaces behind a reverberation time: the inverse of `time_of`.

    Negative where the time is longer than the air alone would allow; not capped. Shape of `time`;
    NaN where the time is. [m²]
    """
    return area_from_time(formula, time, room.volume, room.surface_area, **room.carrier)


def area_uncertainty(room: Shell, time: ArrayLike, time_u: ArrayLike, formula: str) -> Array:
    """Standard uncertainty of `area_of` from that of the time, to first order. [m²]."""
    t = np.asarray(time, float)
    needed = decaying_area(room.volume, t, speed_of_sound=room.speed_of_sound)
    slope = needed / t
    if formula == "eyring":
        slope = slope * np.exp(-(needed - room.air_area) / room.surface_area)
    u: Array = slope * np.asarray(time_u, float)
    return u


def formula_uncertainty(room: Shell, area: ArrayLike, time: ArrayLike) -> Array:
    """Relative standard uncertainty of a formula's time, the coefficients being right.

    Parameters
    ----------
    room
        The shell.
    area
        Absorption area of the room, shape ``(band,)``. [m²]
    time
        Its reverberation time, for the Schroeder frequency, shape ``(band,)``; NaN is skipped. [s]

    Returns
    -------
    u
        Shape ``(band,)``. [-]

    Notes
    -----
    Four parts: half of what lies between Sabine and Eyring as the half-width of a rectangular
    distribution; a floor; the dimensions; and, below the Schroeder frequency 2000 sqrt(T/V)
    (Kuttruff, *Room Acoustics*, (3.44)), an amount per octave for the few modes there.
    """
    between = np.abs(np.log(time_of(room, area, "sabine") / time_of(room, area, "eyring")))
    known = np.asarray(time, float)
    schroeder = 2000.0 * np.sqrt(np.nanmedian(known) / room.volume)
    octaves_below = np.maximum(np.log2(schroeder / exact_midband(OCTAVES)), 0.0)
    modal = np.minimum(MODAL_PER_OCTAVE * octaves_below, MODAL_MOST)
    u: Array = np.sqrt((between / 2.0) ** 2 / 3.0 + FORMULA_FLOOR**2 + room.size_u**2 + modal**2)
    return u
