"""Straight lines on a decay curve, as ISO 3382 asks for them.

Ranges: EDT 0 to −10 dB, T20 −5 to −25 dB, T30 −5 to −35 dB (ISO 3382-1:2009 and ISO 3382-2:2008,
clause 6); the lower end stays at least 10 dB above the noise. Non-linearity and curvature:
ISO 3382-2:2008, annex B; their usual limits of 10 ‰ and 10 % are from memory.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

RANGES: dict[str, tuple[float, float]] = {
    "edt": (0.0, -10.0),
    "t10": (-5.0, -15.0),
    "t15": (-5.0, -20.0),
    "t20": (-5.0, -25.0),
    "t30": (-5.0, -35.0),
}
"""Evaluation ranges relative to the steady level. [dB]"""

LADDER = ("t30", "t20", "t15")
"""The longest range that the noise allows is used; under T15 none is."""

NOISE_MARGIN_DB = 10.0
"""How far the lower end of a range stays above the noise. [dB]"""

CURVED_PERCENT = 10.0
"""Curvature above which a decay is suspect (ISO 3382-2:2008, B.3). [%]"""

CURVED_PERMILLE = 10.0
"""Non-linearity above which a decay is suspect (ISO 3382-2:2008, B.2). [‰]"""


@dataclass(frozen=True, slots=True)
class Line:
    """A straight line through levels."""

    time_s: float
    """Extrapolated to a decay by 60 dB. [s]"""
    start_s: float
    """[s]"""
    start_db: float
    """[dB]"""
    end_s: float
    """[s]"""
    end_db: float
    """[dB]"""
    nonlinearity: float
    """ξ = 1000 (1 − r²). [‰]"""


def straight_line(time: Array, level: Array) -> Line | None:
    """Least-squares line through `level` [dB] over `time` [s]; None unless it falls."""
    if len(time) < 3:
        return None
    middle = float(time.mean())
    spread = time - middle
    slope = float(spread @ level / (spread @ spread))
    if slope >= 0.0:
        return None
    mean = float(level.mean())
    residual = level - (mean + slope * spread)
    variance = float(np.sum((level - mean) ** 2))
    start, end = float(time[0]), float(time[-1])
    return Line(
        time_s=-60.0 / slope,
        start_s=start,
        start_db=mean + slope * (start - middle),
        end_s=end,
        end_db=mean + slope * (end - middle),
        nonlinearity=1000.0 * float(residual @ residual) / variance,
    )


def line_between(
    time: Array, level: Array, located: Array, top: float, bottom: float
) -> Line | None:
    """Line through the points where `located` lies between two levels [dB]."""
    under = np.flatnonzero(located <= bottom)
    if not len(under):
        return None
    first = int(np.argmax(located <= top)) if top < 0.0 else 0
    return straight_line(time[first : under[0] + 1], level[first : under[0] + 1])


def needed_range(name: str) -> float:
    """Range above the noise that an evaluation needs: 35 dB for T20, 45 dB for T30. [dB]."""
    return NOISE_MARGIN_DB - RANGES[name][1]


def standard_lines(
    time: Array, level: Array, located: Array, range_db: float
) -> dict[str, Line | None]:
    """Every evaluation of ISO 3382 that the range above the noise allows; None for the others.

    Parameters
    ----------
    time, level
        The decay curve relative to the steady level, shape ``(point,)``. [s], [dB]
    located
        A smooth curve that says when a level is reached, shape ``(point,)``. [dB]
    range_db
        Steady level above the noise. [dB]
    """
    return {
        name: line_between(time, level, located, top, bottom)
        if range_db >= needed_range(name)
        else None
        for name, (top, bottom) in RANGES.items()
    }


def times_of(lines: dict[str, Line | None]) -> dict[str, float]:
    """The times of the lines, NaN where there is none. [s]."""
    return {name: line.time_s if line else float("nan") for name, line in lines.items()}


def longest(lines: dict[str, Line | None]) -> str:
    """The first of T30, T20, T15 that there is, or nothing."""
    return next((name for name in LADDER if lines[name]), "")


def grouped(values: Array, size: int) -> Array:
    """Means over every `size` frames of the first axis, an incomplete last group left out."""
    whole = len(values) // size
    means: Array = values[: whole * size].reshape(whole, size, *values.shape[1:]).mean(axis=1)
    return means


def drawn(lines: dict[str, Line | None]) -> tuple[tuple[str, float, float, float, float], ...]:
    """The lines as a chart takes them."""
    return tuple(
        (name, line.start_s, line.start_db, line.end_s, line.end_db)
        for name, line in lines.items()
        if line
    )
