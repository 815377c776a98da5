"""Single-number ratings: weighted coefficient and class (ISO 11654), NRC and SAA (ASTM C423).

They are for display. A prediction needs the bands. ISO 11654 is used in its edition of 1997; what the
revision of 2023 changed was not checked.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from planner.bands import THIRDS

RATED_HZ = (250, 500, 1000, 2000, 4000)
"""Octaves of ISO 11654. [Hz]"""

_REFERENCE = (16, 20, 20, 20, 18)
"""Reference curve 0.80, 1.00, 1.00, 1.00, 0.90 in twentieths."""

_CLASSES = ((18, "A"), (16, "B"), (12, "C"), (6, "D"), (3, "E"))
"""Least weighted coefficient of each class, in twentieths."""

WEIGHTED_U = 0.035
"""Reproducibility standard deviation of a weighted coefficient, ISO 12999-2:2020. [-]"""


@dataclass(frozen=True, slots=True)
class Rating:
    """Weighted absorption coefficient after ISO 11654:1997."""

    alpha_w: float
    """[-]"""
    shape: str
    """``L``, ``M``, ``H``: where the material absorbs much more than the number says."""
    absorption_class: str
    """``A`` to ``E``, or ``not classified``."""
    practical: tuple[float, ...]
    """Practical coefficients from 250 Hz to 4 kHz, in steps of 0.05. [-]"""

    def __str__(self) -> str:
        return f"{self.alpha_w:.2f}" + (f" ({self.shape})" if self.shape else "")


@dataclass(frozen=True, slots=True)
class Ratings:
    """The single numbers of one absorber."""

    weighted: Rating
    nrc: float
    """Noise reduction coefficient. [-]"""
    saa: float
    """Sound absorption average. [-]"""


def practical(octave_alpha: ArrayLike) -> tuple[int, ...]:
    """Coefficients in twentieths, at most 20: rounded to 0.05 (ISO 11654, 4.2).

    Two decimals first, as the standard does; integers from then on, since 0.10 has no exact binary
    fraction and the sum of deviations is compared with it.

    Raises
    ------
    ValueError
        A coefficient is missing or negative.
    """
    alpha = np.asarray(octave_alpha, float)
    if not np.all(np.isfinite(alpha) & (alpha >= 0.0)):
        raise ValueError(f"a rating needs a coefficient in every band, got {alpha.tolist()}")
    hundredths = np.floor(alpha * 100.0 + 0.5 + 1e-9).astype(int)
    return tuple(min((int(h) + 2) // 5, 20) for h in hundredths)


def weighted(octave_alpha: ArrayLike) -> Rating:
    """Rating from the octave coefficients 250 Hz to 4 kHz, shape ``(5,)``.

    Where one-third octaves are known, give the mean of the three (ISO 11654, 4.1).

    Raises
    ------
    ValueError
        A coefficient is missing or negative.
    """
    steps = practical(octave_alpha)
    if len(steps) != len(RATED_HZ):
        raise ValueError(f"a rating needs {len(RATED_HZ)} octaves, got {len(steps)}")
    shift = 0
    while sum(max(r - shift - p, 0) for r, p in zip(_REFERENCE, steps, strict=True)) > 2:
        shift += 1
    curve = [r - shift for r in _REFERENCE]
    above = [p - r >= 5 for p, r in zip(steps, curve, strict=True)]
    shape = "L" * above[0] + "M" * (above[1] or above[2]) + "H" * (above[3] or above[4])
    value = max(curve[1], 0)
    name = next((letter for least, letter in _CLASSES if value >= least), "not classified")
    return Rating(value / 20.0, shape, name, tuple(p / 20.0 for p in steps))


def nrc(alpha: ArrayLike) -> float:
    """Mean of 250, 500, 1000 and 2000 Hz, shape ``(4,)``, to the nearest 0.05 (ASTM C423). [-].

    Strictly of one-third octaves; with octave values it is an estimate.
    """
    mean = float(np.mean(np.asarray(alpha, float)))
    return float(np.floor(mean * 20.0 + 0.5 + 1e-9) / 20.0)


def saa(third_octave_alpha: ArrayLike) -> float:
    """Mean of the twelve one-third octaves 200 Hz to 2.5 kHz, shape ``(12,)``, to 0.01. [-].

    ASTM C423, from memory.
    """
    mean = float(np.mean(np.asarray(third_octave_alpha, float)))
    return float(np.floor(mean * 100.0 + 0.5 + 1e-9) / 100.0)


def ratings_of_thirds(alpha: ArrayLike) -> Ratings:
    """All ratings from one-third octaves, shape ``(24,)`` over `planner.bands.THIRDS`."""
    thirds = np.asarray(alpha, float)
    middle = [THIRDS.index(hz) for hz in RATED_HZ]
    octaves = [float(thirds[at - 1 : at + 2].mean()) for at in middle]
    first, last = THIRDS.index(200), THIRDS.index(2500)
    return Ratings(weighted(octaves), nrc(thirds[middle[:4]]), saa(thirds[first : last + 1]))
