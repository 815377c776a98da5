"""Octave and one-third-octave bands: exact midbands (IEC 61260-1:2014), nominal labels (ISO 266).

Band is always the last axis of an array. Unless a function says otherwise, that axis holds the
eight octaves of `OCTAVES`.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

OCTAVES: tuple[int, ...] = (63, 125, 250, 500, 1000, 2000, 4000, 8000)
"""Nominal octave midbands of every table and prediction. [Hz]"""

THIRDS: tuple[int, ...] = (
    50, 63, 80, 100, 125, 160, 200, 250, 315, 400, 500, 630,
    800, 1000, 1250, 1600, 2000, 2500, 3150, 4000, 5000, 6300, 8000, 10000,
)  # fmt: skip
"""Nominal one-third-octave midbands of a measurement. [Hz]"""

OCTAVE_RATIO = 10.0**0.3
"""G, the base-ten octave frequency ratio (IEC 61260-1:2014, formula 1). [-]"""


def exact_midband(nominal: ArrayLike, *, fraction: int = 1) -> NDArray[np.float64]:
    """Exact midband frequencies behind nominal ones.

    Parameters
    ----------
    nominal
        Nominal midband frequencies, any shape. [Hz]
    fraction
        Bandwidth designator: 1 for octaves, 3 for one-third octaves.

    Returns
    -------
    midband
        1000 · G^(x/fraction) with the integer x nearest the nominal value, same shape. [Hz]

    References
    ----------
    .. [1] IEC 61260-1:2014, formulas (2) and (3): odd designators are centred on 1 kHz.
    """
    steps = np.round(fraction * np.log(np.asarray(nominal, float) / 1000.0) / np.log(OCTAVE_RATIO))
    exact: NDArray[np.float64] = 1000.0 * OCTAVE_RATIO ** (steps / fraction)
    return exact


def band_edges(
    nominal: ArrayLike, *, fraction: int = 1
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Lower and upper edge frequencies, f_m · G^(∓1/(2·fraction)), shape of `nominal`. [Hz]."""
    middle = exact_midband(nominal, fraction=fraction)
    half = OCTAVE_RATIO ** (0.5 / fraction)
    return middle / half, middle * half


def bandwidth(nominal: ArrayLike, *, fraction: int = 1) -> NDArray[np.float64]:
    """Width between the edge frequencies: 0.7046 f_m (octave), 0.2308 f_m (third). [Hz]."""
    low, high = band_edges(nominal, fraction=fraction)
    return high - low


def band_label(nominal: float) -> str:
    """Short label for an axis: ``63``, ``125``, ``1k``, ``2.5k``."""
    return f"{nominal:g}" if nominal < 1000 else f"{nominal / 1000:g}k"
