"""Impulses: claps, balloons and impulse responses by backward integration.

The squared response is integrated from its end backwards (ISO 3382-1:2009, 5.3.3), from the point
where the decay sinks into the noise, with the noise taken off and the part that the cut loses
put back. Where that point lies is found by the iteration of Lundeby and others.

References
----------
.. [1] M. R. Schroeder, "New method of measuring reverberation time", J. Acoust. Soc. Am. 37
   (1965) 409.
.. [2] A. Lundeby, T. E. Vigran, H. Bietz, M. Vorländer, "Uncertainties of measurements in room
   acoustics", Acustica 81 (1995) 344-355: truncation point, late slope and compensation.
.. [3] W. T. Chu, "Comparison of reverberation measurements using Schroeder's impulse method and
   decay-curve averaging method", J. Acoust. Soc. Am. 63 (1978) 1444: the noise is subtracted.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.errors import RecordingError
from planner.measure.choice import LINE_SCATTER, short_range
from planner.measure.decay_fits import SETTLE
from planner.measure.figures import BandDecay, DecayCurve, Decays, refused
from planner.measure.filterbank import OCTAVE_BANDS, BandEnergies, Bands, Samples, section_energies
from planner.measure.lines import (
    CURVED_PERCENT,
    CURVED_PERMILLE,
    LADDER,
    NOISE_MARGIN_DB,
    Line,
    drawn,
    grouped,
    line_between,
    longest,
    standard_lines,
    straight_line,
    times_of,
)
from planner.measure.neighbours import with_neighbour_flags
from planner.measure.whole_decay import DECAY_CONSTANT

Array = NDArray[np.float64]

ONSET_DB = -20.0
"""The onset is where the level first comes this near the peak (ISO 3382-1:2009, A.3.4). [dB]"""


@dataclass(frozen=True, slots=True)
class Truncation:
    """Where a decay sinks into the noise."""

    time_s: float
    """Crossing point of the late decay and the noise. [s]"""
    noise: float
    """Mean squared pressure of the noise."""
    late_s: float
    """Reverberation time of the late decay. [s]"""
    level: float
    """Squared pressure of the late decay at the crossing point."""


def onset(samples: Samples) -> int:
    """First sample whose square comes within 20 dB of the largest one.

    Raises
    ------
    RecordingError
        For silence, and where the sound before the peak stands no 20 dB below it.
    """
    squared = np.asarray(samples, float) ** 2
    peak = float(squared.max(initial=0.0))
    if peak <= 0.0 or not np.isfinite(peak):
        raise RecordingError("no impulse: there is only silence")
    return int(np.argmax(squared >= peak * 10.0 ** (ONSET_DB / 10.0)))


def evaluate_impulse(
    read: Callable[[int, int], Samples],
    rate: float,
    start: int,
    stop: int,
    bands: Bands = OCTAVE_BANDS,
    *,
    reverse: bool = True,
) -> Decays:
    """Evaluate the impulse in a section of a recording.

    Parameters
    ----------
    read
        ``read(first, last)`` gives the samples [first, last) of one channel, as for
        `filterbank.section_energies`; for an array ``lambda a, b: samples[a:b]``.
    rate
        Sampling rate. [Hz]
    start, stop
        Section with one impulse and its decay down into the noise. [sample]
    bands, reverse
        As for `filterbank.band_energies`.

    Returns
    -------
    decays
        Figures, reasons and curves of every band; `count` is 1.

    Raises
    ------
    RecordingError
        Where there is no impulse.
    """
    begins = start + onset(read(start, stop))
    energies = section_energies(
        read, rate, start, stop, bands, frame_s=0.001, origin=begins, reverse=reverse
    )
    each = [_evaluate(energies, band) for band in range(len(bands))]
    return with_neighbour_flags(Decays(bands, tuple(each), 1))


def _evaluate(energies: BandEnergies, band: int) -> BandDecay:
    nominal, width = energies.bands.nominal[band], float(energies.bands.width[band])
    settle = SETTLE / width
    kept = (energies.times > -settle) & (energies.times < energies.times[-1] - settle)
    time, energy = energies.times[kept], energies.energy[kept, band]
    if np.count_nonzero(time > 0) < 50 or np.count_nonzero(energy) < 50:
        return refused(nominal, "the recording ends before the decay does")
    cut = truncation(time, energy)
    if cut is None:
        return refused(nominal, "the impulse does not stand out of the noise in this band")
    level, total = backward_integral(time, energy, cut)
    if total <= 0.0:
        return refused(nominal, "the impulse does not stand out of the noise in this band")
    good = np.isfinite(level)
    return _figures(nominal, width, energies.reverse, time[good], level[good], total, cut)


def _figures(
    nominal: float,
    width: float,
    reverse: bool,
    time: Array,
    level: Array,
    total: float,
    cut: Truncation,
) -> BandDecay:
    # Interrupted noise in the same room would show this range: the energy of the whole decay
    # against that of the noise over one decay constant.
    noise = max(cut.noise * cut.late_s / DECAY_CONSTANT, total * 1e-12)
    range_db = float(10.0 * np.log10(total / noise))
    lines = standard_lines(time, level, level, range_db)
    times = times_of(lines)
    curvature = 100.0 * (times["t30"] / times["t20"] - 1.0)
    used = longest(lines)
    line = lines[used] if used else None
    known = {f"{name}_s": value for name, value in times.items()} | {
        "range_db": range_db,
        "level_db": float(10.0 * np.log10(total)),
        "floor_db": float(10.0 * np.log10(noise)),
        "curvature_percent": curvature,
        "nonlinearity_permille": line.nonlinearity if line else float("nan"),
    }
    curve = _curve(time, level, lines)
    if line is None:
        if range_db < 30.0:
            reason = short_range(range_db, "T15", 30.0)
        else:
            reason = "the curve does not fall far enough before the noise"
        return replace(refused(nominal, reason, **known), curve=curve)
    t_s = line.time_s
    deep = line_between(time, level, level, -5.0, min(NOISE_MARGIN_DB - range_db, -35.0))
    relative = _relative_u(used, times, deep.time_s if deep else np.nan, width)
    return replace(
        refused(nominal, "", **known),
        used=used,
        reason=f"the longest range that stays {NOISE_MARGIN_DB:.0f} dB above the noise",
        t_s=t_s,
        u_s=t_s * relative,
        interval_s=(t_s * np.exp(-1.96 * relative), t_s * np.exp(1.96 * relative)),
        flags=_flags(t_s * width, range_db, curvature, line, reverse),
        curve=curve,
    )


def _relative_u(used: str, times: dict[str, float], deepest: float, width: float) -> float:
    """Relative standard uncertainty.

    An integrated response counts as ten decays (ISO 3382-2:2008, 7.2); what the ranges, down to
    the deepest one, differ among themselves comes on top, as a rectangular distribution.
    """
    t_s = times[used]
    others = [times[name] for name in LADDER if np.isfinite(times[name])]
    others += [deepest] if np.isfinite(deepest) else []
    spread = (max(others) - min(others)) / t_s / np.sqrt(12.0)
    return float(np.hypot(LINE_SCATTER[used] / np.sqrt(10.0 * width * t_s), spread))


def _flags(
    resolved: float, range_db: float, curvature: float, line: Line, reverse: bool
) -> tuple[str, ...]:
    doubts = (
        ("curved", abs(curvature) > CURVED_PERCENT or line.nonlinearity > CURVED_PERMILLE),
        ("short-range", range_db < 35.0),
        ("limited-by-filter", resolved < (4.0 if reverse else 16.0)),
    )
    return tuple(word for word, doubt in doubts if doubt)


def _curve(time: Array, level: Array, lines: dict[str, Line | None]) -> DecayCurve:
    size = -(-len(time) // 400)
    at = grouped(time, size)
    return DecayCurve(at, grouped(level, size), np.full(len(at), np.nan), drawn(lines))


def truncation(time: Array, energy: Array) -> Truncation | None:
    """Crossing point of decay and noise, by the iteration of [2]_; None without a decay.

    Parameters
    ----------
    time, energy
        Squared impulse response in short frames, shape ``(frame,)``, onset at time 0. [s]
    """
    step = float(time[1] - time[0])
    size = max(round(0.02 / step), 1)
    noise = float(energy[-max(len(energy) // 10, 5) :].mean())
    found: Truncation | None = None
    for _ in range(8):
        at = grouped(time, size)
        level = 10.0 * np.log10(np.maximum(grouped(energy, size), 1e-300))
        noise_db = 10.0 * np.log10(max(noise, 1e-300))
        peak = int(np.argmax(level))
        lower = 7.0 if found else 10.0  # the first, coarse line keeps farther from the noise
        under = np.flatnonzero(level[peak:] <= noise_db + lower)
        last = peak + (int(under[0]) if len(under) else len(level) - peak)
        first = peak
        if found:  # late slope: the last 20 dB before the noise
            high = np.flatnonzero(level[peak:last] >= noise_db + lower + 20.0)
            first = peak + (int(high[-1]) + 1 if len(high) else 0)
        line = straight_line(at[first:last], level[first:last])
        if line is None:
            return found
        slope = -60.0 / line.time_s
        crossing = line.start_s + (noise_db - line.start_db) / slope
        before = found
        found = Truncation(crossing, noise, line.time_s, noise)
        # Noise: from 7 dB of decay after the crossing point, at least the last tenth.
        tail = min(int((crossing - 7.0 / slope - time[0]) / step), int(0.9 * len(energy)))
        noise = float(energy[max(tail, 0) :].mean())
        size = max(int(10.0 / -slope / 5.0 / step), 1)  # five intervals in 10 dB of decay
        if before and abs(before.time_s - crossing) < 0.01 * crossing:
            break
    return found


def backward_integral(time: Array, energy: Array, cut: Truncation) -> tuple[Array, float]:
    """Backward-integrated decay relative to its beginning, shape ``(frame,)`` [dB], and total.

    NaN after the truncation point.
    """
    step = float(time[1] - time[0])
    inside = time + 0.5 * step <= cut.time_s
    net = np.where(inside, energy - cut.noise, 0.0) * step
    rest = cut.level * cut.late_s / DECAY_CONSTANT
    running = np.cumsum(net[::-1])[::-1] - 0.5 * net + rest
    total = float(net.sum() + rest)
    level = np.full(len(time), np.nan)
    good = inside & (running > 0)
    level[good] = 10.0 * np.log10(running[good] / total)
    return level, total
