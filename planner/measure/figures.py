"""What an evaluated decay says: one band, one position."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.measure.filterbank import Bands

Array = NDArray[np.float64]

FLAGS = {
    "bent": "two slopes: T depends on the range; look at the decay",
    "curved": "T20 and T30 differ: T depends on the range; look at the decay",
    "irregular": "no smooth decay: repeat with more bursts, away from noise",
    "short-range": "less than 35 dB above the noise: play louder or find a quieter hour",
    "few-decays": "scatters: record more bursts at more positions",
    "limited-by-filter": "so short that the band's filter rings as long: an upper bound only",
    "neighbour-leak": "a longer neighbouring band shines through: an upper bound only",
    "refused": "no reverberation time can be read",
}
"""Doubts about a band in words, with the cure."""


def flag_in_words(flag: str) -> str:
    """A doubt in words; those that are words already stay."""
    return FLAGS.get(flag, flag)


def doubts_in_words(bands_hz: Sequence[float], flags: Sequence[Sequence[str]]) -> tuple[str, ...]:
    """Each doubt once, with the bands it is about and its cure."""
    bands: dict[str, list[str]] = {}
    for hz, doubts in zip(bands_hz, flags, strict=True):
        for doubt in doubts:
            bands.setdefault(doubt, []).append(f"{hz:g}")
    return tuple(f"{', '.join(at)} Hz: {flag_in_words(doubt)}." for doubt, at in bands.items())


@dataclass(frozen=True, slots=True)
class DecayCurve:
    """What a chart draws: the decay, thinned to at most 400 points, and the fitted lines."""

    time_s: Array
    """From the switch-off or the onset, shape ``(point,)``. [s]"""
    level_db: Array
    """Relative to the steady level, or to the whole energy of an impulse, ``(point,)``. [dB]"""
    fitted_db: Array
    """The whole-decay fit (NaN where there is none), shape ``(point,)``. [dB]"""
    lines: tuple[tuple[str, float, float, float, float], ...]
    """Per evaluation: name, start [s], start level [dB], end [s], end level [dB]."""


@dataclass(frozen=True, slots=True)
class BandDecay:
    """The decay of one band at one position. A figure that cannot be had is NaN."""

    band_hz: float
    """Nominal midband frequency. [Hz]"""
    edt_s: float
    """Early decay time, from 0 to −10 dB. [s]"""
    t10_s: float
    """From −5 to −15 dB. [s]"""
    t15_s: float
    """From −5 to −20 dB. [s]"""
    t20_s: float
    """From −5 to −25 dB. [s]"""
    t30_s: float
    """From −5 to −35 dB. [s]"""
    range_db: float
    """Steady level (for an impulse: what noise would have had) above the noise floor. [dB]"""
    level_db: float
    """Steady level before the switch-off, relative to a squared pressure of 1. [dB]"""
    floor_db: float
    """Noise floor relative to a squared pressure of 1. [dB]"""
    curvature_percent: float
    """C = 100 (T30/T20 − 1), ISO 3382-2:2008, B.3. [%]"""
    nonlinearity_permille: float
    """ξ = 1000 (1 − r²) over the longest range there is, ISO 3382-2:2008, B.2. [‰]"""
    whole_s: float
    """Whole-decay fit of one exponential; NaN for an impulse. [s]"""
    whole_u_s: float
    """Its standard uncertainty. [s]"""
    two_slopes_s: tuple[float, float] | None
    """Both times where two exponentials are clearly better than one. [s]"""
    used: str
    """``whole-decay``, ``t30``, ``t20``, ``t15``, or empty where the band is refused."""
    reason: str
    """Why this one, or why none and what to change, in words."""
    t_s: float
    """The value to use; NaN when refused. [s]"""
    u_s: float
    """Its standard uncertainty as the decay time at this very position. [s]

    How the time differs from position to position is not in it: see `survey`.
    """
    interval_s: tuple[float, float]
    """95 % interval of the same. [s]"""
    flags: tuple[str, ...]
    """Doubts, a word each: ``refused``, ``bent``, ``curved``, ``irregular``, ``short-range``,
    ``few-decays``, ``limited-by-filter``, ``neighbour-leak``."""
    curve: DecayCurve


@dataclass(frozen=True, slots=True)
class Decays:
    """All bands of one position."""

    bands: Bands
    each: tuple[BandDecay, ...]
    """One per band."""
    count: int
    """Bursts in the ensemble. [-]"""

    def column(self, field: str) -> Array:
        """One number of every band, shape ``(band,)``: ``decays.column("t_s")``."""
        return np.array([getattr(band, field) for band in self.each], float)


def refused(nominal: float, reason: str, **known: float) -> BandDecay:
    """A band without a value to use; what is `known` nevertheless is kept."""
    nan = float("nan")
    empty = np.zeros(0)
    figures = dict.fromkeys(
        ("edt_s", "t10_s", "t15_s", "t20_s", "t30_s", "range_db", "level_db", "floor_db",
         "curvature_percent", "nonlinearity_permille", "whole_s", "whole_u_s", "t_s", "u_s"),
        nan,
    )  # fmt: skip
    return BandDecay(
        band_hz=nominal,
        two_slopes_s=None,
        used="",
        reason=reason,
        interval_s=(nan, nan),
        flags=("refused",),
        curve=DecayCurve(empty, empty, empty, ()),
        **(figures | known),
    )
