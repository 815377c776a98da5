"""The bass at a seat: pressure from a loudspeaker by damped modes, and what makes its peaks and dips.

Arrays first: mode shapes at points, then the sum over modes. Levels are against the free field of the
same loudspeaker at one metre, so that a room without modes would read about 0 dB at one metre.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.predict.reflections import mirrored
from planner.room.geometry import Frame

Array = NDArray[np.float64]

LOWEST_HZ = 20.0
"""Where a response begins. [Hz]"""

MODES_TO = 1.7
"""Modes are summed up to this many times the highest frequency: the tail that is left out is smooth
and under 1 dB at peaks. [-]"""

POINTS_PER_OCTAVE = 24


@dataclass(frozen=True, slots=True)
class Extreme:
    """A peak or a dip, and the modes that make it."""

    hz: float
    level_db: float
    is_peak: bool
    modes: tuple[int, ...]
    """Numbers of the modes with the largest part in it, largest first."""


@dataclass(frozen=True, slots=True)
class Interference:
    """First cancellation of the direct sound by one surface."""

    surface: str
    hz: float
    """Where the reflected way is half a wavelength longer. [Hz]"""
    excess: float
    """By how much it is longer. [m]"""


def frequencies(highest_hz: float, *, per_octave: int = POINTS_PER_OCTAVE) -> Array:
    """Frequencies of a response, evenly over their logarithm from 20 Hz. [Hz]."""
    count = int(np.ceil(per_octave * np.log2(highest_hz / LOWEST_HZ))) + 1
    return np.geomspace(LOWEST_HZ, highest_hz, max(count, 2))


def shape_at(points: ArrayLike, orders: NDArray[np.intp], dimensions: ArrayLike) -> Array:
    """Mode shapes of a rectangular room at some points.

    Parameters
    ----------
    points
        Shape ``(..., 3)``. [m]
    orders
        Shape ``(mode, 3)``.
    dimensions
        Length, width, height. [m]

    Returns
    -------
    shape
        Products of cosines scaled so that the mean square over the room is one, ``(..., mode)``.
    """
    p = np.asarray(points, float)[..., None, :]
    waves = np.cos(np.pi * orders * p / np.asarray(dimensions, float))
    weight = np.sqrt(np.where(orders > 0, 2.0, 1.0)).prod(axis=-1)
    shape: Array = waves.prod(axis=-1) * weight
    return shape


def kernel(
    hz: ArrayLike,
    mode_hz: ArrayLike,
    decay_time: ArrayLike,
    volume: float,
    *,
    speed_of_sound: float = 343.0,
) -> NDArray[np.complex128]:
    """What each mode answers at each frequency, shape ``(frequency, mode)``.

    Multiply by the mode's shape at source and receiver and add up: the pressure against that of the
    source in free field at one metre. The constant mode has frequency 0.

    Notes
    -----
    p = 4π/V Σ ψ(r) ψ(s) / (k_n² + 2 j k δ_n/c − k²), δ = 3 ln(10)/T (Kuttruff, *Room Acoustics*,
    3.1; Morse and Ingard, 9.4; from memory). For light damping.
    """
    f = np.asarray(hz, float)[:, None]
    k, kn = 2 * np.pi * f / speed_of_sound, 2 * np.pi * np.asarray(mode_hz, float) / speed_of_sound
    damping = 3.0 * np.log(10.0) / np.asarray(decay_time, float) / speed_of_sound
    answer: NDArray[np.complex128] = 4.0 * np.pi / volume / (kn**2 + 2j * k * damping - k**2)
    return answer


def level(pressure: ArrayLike) -> Array:
    """20 lg of the magnitude. [dB]."""
    decibels: Array = 20.0 * np.log10(np.maximum(np.abs(np.asarray(pressure)), 1e-12))
    return decibels


def extremes(
    hz: Array, parts: NDArray[np.complex128], *, most: int = 3, prominence_db: float = 3.0
) -> list[Extreme]:
    """Peaks and dips of a response, with the modes that dominate each.

    Parameters
    ----------
    hz
        Shape ``(frequency,)``. [Hz]
    parts
        What each mode contributes, shape ``(frequency, mode)``; their sum is the response.
    most
        Modes named for each.
    prominence_db
        Smaller ones are not worth a name. [dB]
    """
    from scipy.signal import find_peaks

    curve = level(parts.sum(axis=1))
    found = []
    for sign, is_peak in ((1.0, True), (-1.0, False)):
        for at in find_peaks(sign * curve, prominence=prominence_db)[0]:
            strongest = np.argsort(-np.abs(parts[at]))[:most]
            found.append(
                Extreme(float(hz[at]), float(curve[at]), is_peak, tuple(int(n) for n in strongest))
            )
    return sorted(found, key=lambda one: one.hz)


def boundary_interference(
    frames: Mapping[str, Frame],
    source: ArrayLike,
    receiver: ArrayLike,
    *,
    speed_of_sound: float = 343.0,
) -> list[Interference]:
    """Where each surface first cancels the direct sound, lowest first.

    f = c / (2 (r_reflected − r_direct)); for a loudspeaker d before a wall, heard from far on its
    axis, that is c / (4 d), the quarter-wave rule.
    """
    begin, end = np.asarray(source, float), np.asarray(receiver, float)
    direct = float(np.linalg.norm(end - begin))
    found = []
    for name, frame in frames.items():
        excess = float(np.linalg.norm(end - mirrored(begin, frame))) - direct
        if excess > 1e-6:
            found.append(Interference(name, speed_of_sound / (2.0 * excess), excess))
    return sorted(found, key=lambda one: one.hz)


def unevenness(curve_db: ArrayLike, hz: ArrayLike) -> Array:
    """Standard deviation of a level over the frequencies, on the last axis. [dB].

    After a third of an octave of smoothing, which is what an ear makes of it (common practice).
    """
    curve = np.asarray(curve_db, float)
    steps = np.asarray(hz, float)
    width = max(round(np.log(2.0) / 3.0 / float(np.log(steps[1] / steps[0]))), 1)
    total = np.cumsum(np.pad(curve, [(0, 0)] * (curve.ndim - 1) + [(1, 0)]), axis=-1)
    smooth = (total[..., width:] - total[..., :-width]) / width
    spread: Array = np.std(smooth, axis=-1)
    return spread
