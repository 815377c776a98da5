"""Modes of rectangular rooms: frequencies, kinds, spacing, count and decay."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.bands import OCTAVES, band_edges, exact_midband

Array = NDArray[np.float64]

THIRD_OCTAVES: tuple[float, ...] = (
    20, 25, 31.5, 40, 50, 63, 80, 100, 125, 160, 200, 250, 315, 400, 500,
)  # fmt: skip
"""Nominal one-third octaves in which modes are counted. [Hz]"""

COINCIDENT = 0.05
"""Modes within this share of each other's frequency are said to coincide (common practice). [-]"""

KINDS = ("axial", "tangential", "oblique")


@dataclass(frozen=True, slots=True)
class Modes:
    """Modes of one room in ascending order."""

    hz: Array
    """Shape ``(mode,)``. [Hz]"""
    orders: NDArray[np.intp]
    """Half waves along x, y and z, shape ``(mode, 3)``; for other footprints the number of the
    plan mode, 0, and half waves along z."""
    kinds: tuple[str, ...]
    """``axial``, ``tangential`` or ``oblique``; ``level``, ``upright`` or ``mixed`` where the plan
    is no rectangle."""
    t_s: Array
    """Decay time, NaN where it was not asked for, shape ``(mode,)``. [s]"""

    @property
    def labels(self) -> tuple[str, ...]:
        """Orders as people write them: ``1 0 0``."""
        return tuple(" ".join(str(n) for n in row) for row in self.orders.tolist())

    @property
    def spacing(self) -> Array:
        """Distance to the next mode above, shape ``(mode - 1,)``. [Hz]."""
        return np.diff(self.hz)


def rectangular_modes(
    dimensions: ArrayLike, highest_hz: float, *, speed_of_sound: float = 343.0
) -> tuple[Array, NDArray[np.intp]]:
    """Every mode of a rigid rectangular room up to a frequency.

    Parameters
    ----------
    dimensions
        Length, width and height. [m]
    highest_hz
        [Hz]
    speed_of_sound
        [m/s]

    Returns
    -------
    hz, orders
        Ascending, shapes ``(mode,)`` and ``(mode, 3)``; the zero-frequency mode is left out.
        [Hz], [-]

    References
    ----------
    .. [1] H. Kuttruff, *Room Acoustics*, 3.1: f = (c/2) sqrt((l/Lx)² + (m/Ly)² + (n/Lz)²).
    """
    size = np.asarray(dimensions, float)
    most = np.floor(2.0 * size * highest_hz / speed_of_sound).astype(int)
    orders = np.stack(np.meshgrid(*(np.arange(n + 1) for n in most), indexing="ij"), -1)
    orders = orders.reshape(-1, 3)
    hz = 0.5 * speed_of_sound * np.sqrt(((orders / size) ** 2).sum(axis=1))
    kept = np.flatnonzero((hz > 0) & (hz <= highest_hz))
    kept = kept[np.argsort(hz[kept], kind="stable")]
    return hz[kept], orders[kept]


def kind_of(orders: NDArray[np.intp]) -> tuple[str, ...]:
    """``axial``, ``tangential`` or ``oblique``: one, two or three orders are not zero."""
    return tuple(KINDS[int(n) - 1] for n in (orders > 0).sum(axis=1))


def mode_decay(
    hz: ArrayLike,
    orders: NDArray[np.intp],
    dimensions: ArrayLike,
    wall_alpha: Mapping[str, Array],
    *,
    speed_of_sound: float = 343.0,
    further_area: ArrayLike = 0.0,
) -> Array:
    """Decay time of each mode from the coefficients of the walls it presses on.

    Parameters
    ----------
    hz, orders
        Of the modes, shapes ``(mode,)`` and ``(mode, 3)``.
    dimensions
        Length, width and height. [m]
    wall_alpha
        Mean random-incidence coefficient of ``front``, ``back``, ``left``, ``right``, ``floor`` and
        ``ceiling`` over `planner.bands.OCTAVES`, shape ``(band,)`` each. [-]
    speed_of_sound
        [m/s]
    further_area
        Absorption area of furnishings, shape ``(band,)``. [m²]

    Returns
    -------
    decay_time
        For 60 dB, shape ``(mode,)``. [s]

    Notes
    -----
    A locally reacting wall of small real admittance β takes the energy c β S ⟨p²⟩_wall / V a
    second; ⟨p²⟩ on a wall is twice that of the volume where the mode has half waves across it, and
    the same where it grazes [1]_. Random incidence sees α = 8 β, so that an oblique mode decays as
    Sabine's formula says and an axial one more slowly. For walls that resonate, or absorb more than
    about half, this is an estimate.

    References
    ----------
    .. [1] P. M. Morse and K. U. Ingard, *Theoretical Acoustics*, 9.4; H. Kuttruff, *Room
       Acoustics*, 3.2 (from memory).
    """
    f, size = np.asarray(hz, float), np.asarray(dimensions, float)
    volume = float(size.prod())
    pairs = (("front", "back"), ("left", "right"), ("floor", "ceiling"))
    rate = np.zeros(len(f))
    for axis, names in enumerate(pairs):
        wall = volume / size[axis]
        pressing = np.where(orders[:, axis] > 0, 2.0, 1.0)
        for name in names:
            beta = at_frequency(wall_alpha[name], f) / 8.0
            rate += speed_of_sound * beta * wall * pressing / volume
    spread = np.broadcast_to(np.asarray(further_area, float), (len(OCTAVES),))
    rate += speed_of_sound * at_frequency(spread, f) / (4.0 * volume)
    with np.errstate(divide="ignore"):
        time: Array = 6.0 * np.log(10.0) / rate
    return time


def at_frequency(octave_values: ArrayLike, hz: ArrayLike) -> Array:
    """Octave values read at any frequency, linear in its logarithm; held beyond the ends."""
    value: Array = np.interp(
        np.log2(np.asarray(hz, float)), np.log2(exact_midband(OCTAVES)), np.asarray(octave_values)
    )
    return value


def weyl_count(hz: ArrayLike, volume: float, surface_area: float, edge_length: float) -> Array:
    """Modes expected below a frequency: 4π/3 V (f/c)³ + π/4 S (f/c)² + L/8 (f/c), c = 343 m/s.

    `edge_length` is that of all edges, 4 (Lx + Ly + Lz) for a box (Morse 1948; Kuttruff (3.20)).
    """
    return weyl_count_at(np.asarray(hz, float) / 343.0, volume, surface_area, edge_length)


def weyl_count_at(
    waves_per_metre: ArrayLike, volume: float, surface_area: float, edge_length: float
) -> Array:
    """`weyl_count` over f/c. [1/m]."""
    x = np.asarray(waves_per_metre, float)
    count: Array = (
        4.0 * np.pi / 3.0 * volume * x**3
        + np.pi / 4.0 * surface_area * x**2
        + edge_length / 8.0 * x
    )
    return count


def third_octave_count(hz: ArrayLike, highest_hz: float) -> tuple[tuple[float, ...], Array]:
    """Modes per one-third octave, for the bands that end below `highest_hz`.

    Returns
    -------
    bands_hz, count
        Nominal midbands [Hz] and numbers of modes, shape ``(band,)``.
    """
    low, high = band_edges(THIRD_OCTAVES, fraction=3)
    whole = high <= highest_hz * 1.0001
    f = np.sort(np.asarray(hz, float))
    count = np.searchsorted(f, high[whole]) - np.searchsorted(f, low[whole])
    bands = tuple(hz for hz, kept in zip(THIRD_OCTAVES, whole, strict=True) if kept)
    return bands, count.astype(float)


def coincidences(hz: ArrayLike, within: float = COINCIDENT) -> list[tuple[int, int]]:
    """Neighbouring modes whose frequencies lie within a share of each other, as pairs of indices."""
    f = np.asarray(hz, float)
    close = np.flatnonzero(np.diff(f) <= within * f[:-1])
    return [(int(n), int(n) + 1) for n in close]


def spacing_index(hz: ArrayLike) -> Array:
    """Mean square of the spacings over the square of their mean, on the last axis; 1 is even. [-].

    NaN entries (beyond a limit) are left out. Bolt's spacing index, from memory.
    """
    gaps = np.diff(np.asarray(hz, float), axis=-1)
    valid = np.isfinite(gaps)
    count = np.maximum(valid.sum(axis=-1), 1)
    gaps = np.where(valid, gaps, 0.0)
    mean = gaps.sum(axis=-1) / count
    with np.errstate(divide="ignore", invalid="ignore"):
        index: Array = (gaps**2).sum(axis=-1) / count / mean**2
    return index
