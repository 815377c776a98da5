"""Reverberation times of one microphone position: from band energies to figures with reasons.

Bursts of interrupted noise, aligned at the switch-off, are averaged as squared pressure (ensemble
average, ISO 3382-2:2008, 5.3); `impulse` brings impulses into the same shape. Each band then gets
the straight-line evaluations of the standard, the whole-decay fit, and the value to use.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.errors import RecordingError
from planner.measure.filterbank import BandEnergies, Bands

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class DecayCurve:
    """What a chart draws: the decay, thinned to at most 400 points, and the fitted lines."""

    time_s: Array
    """From the switch-off or the onset, shape ``(point,)``. [s]"""
    level_db: Array
    """Relative to the steady level, shape ``(point,)``. [dB]"""
    fitted_db: Array
    """The whole-decay fit (NaN where there is none), shape ``(point,)``. [dB]"""
    lines: tuple[tuple[str, float, float, float, float], ...]
    """Per evaluation: name, start [s], start level [dB], end [s], end level [dB]."""


@dataclass(frozen=True, slots=True)
class BandDecay:
    """The decay of one band at one position. A time that cannot be had is NaN."""

    band_hz: float
    """Nominal midband frequency. [Hz]"""
    edt_s: float
    """From 0 to −10 dB. [s]"""
    t10_s: float
    """From −5 to −15 dB. [s]"""
    t15_s: float
    """From −5 to −20 dB. [s]"""
    t20_s: float
    """From −5 to −25 dB. [s]"""
    t30_s: float
    """From −5 to −35 dB. [s]"""
    range_db: float
    """Steady level (or peak) above the noise floor. [dB]"""
    level_db: float
    """Steady level before the switch-off, relative to a squared pressure of 1. [dB]"""
    floor_db: float
    """Noise floor relative to a squared pressure of 1. [dB]"""
    curvature_percent: float
    """C = 100 (T30/T20 − 1), ISO 3382-2 B.3. [%]"""
    nonlinearity_permille: float
    """ξ = 1000 (1 − r²) over the range of T20 or T30, ISO 3382-2 B.2. [‰]"""
    whole_s: float
    """Whole-decay fit. [s]"""
    whole_u_s: float
    """Its standard uncertainty. [s]"""
    two_slopes_s: tuple[float, float] | None
    """Both times where two exponentials are clearly better than one. [s]"""
    used: str
    """``whole-decay``, ``t30``, ``t20``, ``t15`` or empty: refused."""
    reason: str
    """Why this one, or why none, in words."""
    t_s: float
    """The value to use; NaN when refused. [s]"""
    u_s: float
    """Its standard uncertainty as the decay time at this position. [s]"""
    interval_s: tuple[float, float]
    """95 % interval. [s]"""
    flags: tuple[str, ...]
    """Doubts, one word or hyphenated words each: ``bent``, ``short-range``, …"""
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


def ensemble_average(bursts: Sequence[BandEnergies]) -> BandEnergies:
    """Average of squared pressure over bursts aligned at the switch-off (`origin`).

    Only the time that all bursts have is kept; frames must match.

    Raises
    ------
    RecordingError
        Without a burst, or when the frames of two bursts do not line up.
    """
    if not bursts:
        raise RecordingError("no usable decay", cure="Record noise that is switched off at once.")
    frame_s = bursts[0].frame_s
    begin = max(round(burst.begin_s / frame_s) for burst in bursts)
    end = min(round(burst.begin_s / frame_s) + len(burst.energy) for burst in bursts)
    if any(abs(burst.frame_s - frame_s) > 1e-12 for burst in bursts):
        raise RecordingError("bursts were cut into frames of different length")
    parts = []
    for burst in bursts:
        first = begin - round(burst.begin_s / frame_s)
        parts.append(burst.energy[first : first + max(end - begin, 0)])
    return BandEnergies(
        np.mean(parts, axis=0), frame_s, begin * frame_s, bursts[0].bands, bursts[0].reverse
    )


def evaluate_decays(bursts: Sequence[BandEnergies]) -> Decays:
    """Evaluate the bursts of interrupted noise of one position.

    Parameters
    ----------
    bursts
        One per switch-off, frames counted from it (`origin` of `section_energies`): at least
        0.5 s of steady noise before it, the decay and as much of the floor as there is after
        it, ending before the next burst begins. All with the same bands and frames (1 ms).

    Returns
    -------
    decays
        Figures, reasons and curves of every band.

    Raises
    ------
    RecordingError
        Without a burst or when they do not match.
    """
    from planner.measure.evaluation import evaluate_band
    from planner.measure.neighbours import with_neighbour_flags

    mean = ensemble_average(bursts)
    if len(mean.energy) < 20 or mean.begin_s >= 0 or mean.times[-1] <= 0:
        raise RecordingError("no noise before or no silence after the switch-off")
    each = [evaluate_band(mean, band, len(bursts)) for band in range(len(mean.bands))]
    return with_neighbour_flags(Decays(mean.bands, tuple(each), len(bursts)))
