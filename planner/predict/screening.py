"""Many treatments of one room at once: reverberation times by Sabine and Eyring, block by block.

For a million options the arithmetic is a matrix product; everything else must not cost more than
that. So it is done in place, on blocks that stay in the processor's cache.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.predict.reverberation import LARGEST_ALPHA, SPEED_OF_SOUND, decay_constant

Array = NDArray[np.float64]

BLOCK = 4096
"""Options of a block."""


@dataclass(frozen=True, slots=True)
class Block:
    """Times of a block of options; the arrays are used again for the next one."""

    start: int
    """Number of its first option."""
    sabine: Array
    """Shape ``(option, band)``. [s]"""
    eyring: Array
    """Shape ``(option, band)``. [s]"""


def screen(
    areas: ArrayLike,
    gain: ArrayLike,
    base_area: ArrayLike,
    *,
    volume: float,
    surface_area: float,
    air_attenuation: ArrayLike = 0.0,
    speed_of_sound: float = SPEED_OF_SOUND,
    block: int = BLOCK,
) -> Iterator[Block]:
    """Reverberation times of many options.

    Parameters
    ----------
    areas
        Area of each item in each option, shape ``(option, item)``. [m²]
    gain
        Coefficient of each item less that of the surface it hides, shape ``(item, band)``. [-]
    base_area
        Absorption area of the untreated room, shape ``(band,)``. [m²]
    volume, surface_area
        [m³], [m²]
    air_attenuation, speed_of_sound
        Shape ``(band,)`` [1/m]; [m/s].
    block
        Options at a time.

    Yields
    ------
    block
        Valid until the next one is asked for: take what is needed from it.

    Notes
    -----
    Mean coefficients are capped at 0.99 for Eyring, as everywhere.
    """
    amounts, effect = np.asarray(areas, float), np.asarray(gain, float)
    base = np.asarray(base_area, float)
    air = np.broadcast_to(4.0 * np.asarray(air_attenuation, float) * volume, base.shape)
    scale = float(decay_constant(speed_of_sound)) * volume
    bands = len(base)
    absorbed, sabine, eyring = (np.empty((block, bands)) for _ in range(3))
    for start in range(0, len(amounts), block):
        piece = amounts[start : start + block]
        count = len(piece)
        a, s, e = absorbed[:count], sabine[:count], eyring[:count]
        np.matmul(piece, effect, out=a)
        a += base
        np.add(a, air, out=s)
        np.divide(scale, s, out=s)
        np.divide(a, -surface_area, out=e)
        np.maximum(e, -LARGEST_ALPHA, out=e)
        np.log1p(e, out=e)
        e *= -surface_area
        e += air
        np.divide(scale, e, out=e)
        yield Block(start, s, e)
