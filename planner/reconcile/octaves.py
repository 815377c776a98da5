"""A measurement on the eight octaves of every prediction, whichever bands it was made in."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES, THIRDS
from planner.reconcile.words import listed_bands

if TYPE_CHECKING:
    from planner.measure.measured import Measured

SURVEY_ACCURACY = 0.10
"""Relative standard uncertainty taken where a table gives none: the nominal accuracy of the survey
method (ISO 3382-2:2008, table 1, from memory). [-]"""


@dataclass(frozen=True, slots=True)
class OctaveTimes:
    """Measured reverberation times per octave of `OCTAVES`; NaN where there is none."""

    t_s: NDArray[np.float64]
    """Shape ``(band,)``. [s]"""
    u_s: NDArray[np.float64]
    """Standard uncertainty, shape ``(band,)``. [s]"""
    warnings: tuple[str, ...]


def octave_times(measured: Measured) -> OctaveTimes:
    """Reverberation times per octave of a measurement in octaves or one-third octaves.

    Three one-third octaves are joined to an octave by the arithmetic mean of their times; half of
    their range is added to its uncertainty, because one octave with three different decays has no
    single one. An octave with a third missing is missing.
    """
    bands = [round(float(hz)) for hz in measured.bands_hz]
    times, errors = np.asarray(measured.t_s, float), np.asarray(measured.u_s, float)
    times = np.where(times > 0, times, np.nan)
    warnings = []
    unknown = np.isfinite(times) & ~(np.isfinite(errors) & (errors > 0))
    if unknown.any():
        errors = np.where(unknown, SURVEY_ACCURACY * times, errors)
        listed = listed_bands(hz for hz, flag in zip(bands, unknown, strict=True) if flag)
        warnings.append(
            f"The measurement gives no uncertainty at {listed}: {SURVEY_ACCURACY:.0%} is assumed, "
            "as of a survey."
        )
    by_band = {hz: (t, u) for hz, t, u in zip(bands, times, errors, strict=True)}
    if any(hz in THIRDS and hz not in OCTAVES for hz in bands):
        warnings.append("The measurement is in one-third octaves: three are joined to an octave.")
        pairs = [_joined(by_band, hz) for hz in OCTAVES]
    else:
        pairs = [by_band.get(hz, (np.nan, np.nan)) for hz in OCTAVES]
    values = np.array(pairs, float)
    values[np.isnan(values).any(axis=1)] = np.nan
    return OctaveTimes(values[:, 0], values[:, 1], tuple(warnings))


def _joined(by_band: dict[int, tuple[float, float]], octave: int) -> tuple[float, float]:
    middle = THIRDS.index(octave)
    thirds = [by_band.get(hz, (np.nan, np.nan)) for hz in THIRDS[middle - 1 : middle + 2]]
    times, errors = np.array(thirds, float).T
    spread = 0.5 * np.ptp(times) / np.sqrt(3.0)
    return float(times.mean()), float(np.hypot(np.sqrt(np.sum(errors**2)) / 3.0, spread))
