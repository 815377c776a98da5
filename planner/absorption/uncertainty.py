"""How far a coefficient may be off, and what stands in for one that no source gives."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

REPRODUCIBILITY_M = np.array([0.450, 0.180, 0.059, 0.0, 0.0, 0.0, 0.0, 0.026])
"""Slope of the reproducibility standard deviation per octave, ISO 12999-2:2020: the one-third-octave
values at 63 and 125 Hz, the octave values from 250 Hz to 4 kHz; 8 kHz is beyond the standard and
takes the value of 5 kHz. [-]"""

REPRODUCIBILITY_N = np.array([0.015, 0.015, 0.016, 0.040, 0.040, 0.040, 0.050, 0.060])
"""Its offset, from the same places. [-]"""

BOOK_SHARE = 0.15
"""A row in a book is not a test of the wall in front of you: common practice, no source. [-]"""

ASSUMED_SHARE = 0.5
"""Additional standard uncertainty of a value that no source gives, as a share of it. [-]"""

LOW_RATIO, HIGH_RATIO = (0.5, 1.0), (0.8, 1.25)
"""Between these a missing end band lies against its neighbour, below and above. [-]"""


def reproducibility(alpha: ArrayLike) -> Array:
    """Standard deviation between laboratories, s_R = m α + n.

    Parameters
    ----------
    alpha
        Coefficients, shape ``(..., band)`` over `planner.bands.OCTAVES`. [-]

    Returns
    -------
    s_r
        Same shape. Coverage factor 2 gives 95 %. [-]

    References
    ----------
    .. [1] ISO 12999-2:2020, tables for α_s and α_p.
    """
    s_r: Array = REPRODUCIBILITY_M * np.asarray(alpha, float) + REPRODUCIBILITY_N
    return s_r


def table_uncertainty(alpha: ArrayLike) -> Array:
    """Standard uncertainty of a book value, shape of `alpha` ``(..., band)``. [-].

    Reproducibility after ISO 12999-2, at most half the coefficient (hard surfaces are not known from
    reverberation rooms, and no coefficient is negative), and 15 % of it, added in squares.
    """
    values = np.asarray(alpha, float)
    laboratory = np.minimum(reproducibility(values), 0.5 * values)
    return np.hypot(laboratory, BOOK_SHARE * values)


def item_uncertainty(area: ArrayLike) -> Array:
    """Standard uncertainty of an absorption area per item: 20 % of it; a judgement. [m²]."""
    u: Array = 0.2 * np.asarray(area, float)
    return u


def filled(values: ArrayLike) -> tuple[Array, NDArray[np.bool_]]:
    """Coefficients with the missing bands filled.

    Parameters
    ----------
    values
        Shape ``(band,)`` over `planner.bands.OCTAVES`, NaN where no source gives one. [-]

    Returns
    -------
    alpha
        Complete, shape ``(band,)``. [-]
    assumed
        Which bands were filled.

    Notes
    -----
    Ends: the log-log trend of the two nearest known bands goes on, step by step, each step's ratio
    kept within `LOW_RATIO` or `HIGH_RATIO`. Inside: interpolated over the logarithm of frequency.
    The rule is ours.
    """
    alpha = np.array(values, float)
    assumed = np.isnan(alpha)
    known = np.flatnonzero(~assumed)
    step = np.arange(len(alpha))
    alpha = np.interp(step, known, alpha[known])
    first, last = int(known[0]), int(known[-1])
    down = np.clip(_ratio(alpha[first], alpha[known[1]], known[1] - first), *LOW_RATIO)
    up = np.clip(_ratio(alpha[last], alpha[known[-2]], last - known[-2]), *HIGH_RATIO)
    alpha[:first] = alpha[first] * down ** (first - step[:first])
    alpha[last + 1 :] = alpha[last] * up ** (step[last + 1 :] - last)
    return alpha, assumed


def _ratio(end: float, inner: float, steps: int) -> float:
    """Ratio per octave from the inner band to the end band; 1 where there is no trend to follow."""
    if end <= 0 or inner <= 0:
        return 1.0
    return float((end / inner) ** (1.0 / steps))
