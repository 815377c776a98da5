"""One band: straight lines on the decay curve (ISO 3382), the whole-decay fit, and which to use.

Sources: ISO 3382-1:2009 and ISO 3382-2:2008 for the ranges (EDT 0 to −10 dB, T20 −5 to −25 dB,
T30 −5 to −35 dB, the range ending at least 10 dB above the noise), ISO 3382-2:2008 annex B for
curvature and non-linearity.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.measure.decay import BandDecay, DecayCurve
from planner.measure.filterbank import BandEnergies
from planner.measure.whole_decay import DECAY_CONSTANT, WholeDecay, fit_whole_decay

Array = NDArray[np.float64]

RANGES: dict[str, tuple[float, float]] = {
    "edt": (0.0, -10.0),
    "t10": (-5.0, -15.0),
    "t15": (-5.0, -20.0),
    "t20": (-5.0, -25.0),
    "t30": (-5.0, -35.0),
}
"""Evaluation ranges relative to the steady level. [dB]"""

NOISE_MARGIN_DB = 10.0
"""How far the lower end of a range stays above the noise. [dB]"""

LEAST_RANGE_DB = 20.0
"""Under this range above the noise even the whole-decay fit is refused. [dB]"""

GUARD_S = 0.003
"""Skipped after the switch-off, whose place is known to 2 ms. [s]"""

SETTLE = 5.0
"""A band needs this over its width to ring down by more than 60 dB. [-]"""


@dataclass(frozen=True, slots=True)
class Line:
    """A straight line through levels."""

    time_s: float
    """Extrapolated to 60 dB. [s]"""
    start_s: float
    start_db: float
    end_s: float
    end_db: float
    nonlinearity: float
    """ξ. [‰]"""


def straight_line(time: Array, level: Array) -> Line | None:
    """Least-squares line through `level` [dB] over `time` [s]; None unless it falls."""
    if len(time) < 3:
        return None
    middle = time.mean()
    spread = time - middle
    slope = float(spread @ level / (spread @ spread))
    if slope >= 0:
        return None
    top = float(level.mean()) - slope * middle
    residual = level - (top + slope * time)
    variance = float(np.sum((level - level.mean()) ** 2))
    start, end = float(time[0]), float(time[-1])
    return Line(
        time_s=-60.0 / slope,
        start_s=start,
        start_db=top + slope * start,
        end_s=end,
        end_db=top + slope * end,
        nonlinearity=1000.0 * float(residual @ residual) / variance,
    )


def has_range(name: str, range_db: float) -> bool:
    """Whether the range of an evaluation ends far enough above the noise."""
    return range_db >= -RANGES[name][1] + NOISE_MARGIN_DB


def standard_lines(
    time: Array, level: Array, located: Array, range_db: float
) -> dict[str, Line | None]:
    """The evaluations of ISO 3382 that the range allows.

    Parameters
    ----------
    time, level
        The decay curve relative to the steady level, shape ``(point,)``. [s], [dB]
    located
        A smooth curve that says where the levels are reached, shape ``(point,)``. [dB]
    range_db
        Steady level above the noise. [dB]
    """
    lines: dict[str, Line | None] = {}
    for name, (top, bottom) in RANGES.items():
        lines[name] = None
        if has_range(name, range_db) and np.any(located <= bottom):
            last = int(np.argmax(located <= bottom))
            first = int(np.argmax(located <= top)) if top < 0 else 0
            lines[name] = straight_line(time[first : last + 1], level[first : last + 1])
    return lines


def grouped(energy: Array, count: int) -> Array:
    """Mean over every `count` frames, the last incomplete group left out."""
    whole = len(energy) // count
    means: Array = energy[: whole * count].reshape(whole, count, *energy.shape[1:]).mean(axis=1)
    return means


def evaluate_band(mean: BandEnergies, band: int, count: int) -> BandDecay:
    """Figures of one band from the ensemble average of `count` bursts."""
    nominal = mean.bands.nominal[band]
    width = float(mean.bands.width[band])
    energy = mean.energy[:, band]
    steady = _steady(mean.times, energy, width)
    decaying = (mean.times > GUARD_S) & (mean.times < mean.times[-1] - SETTLE / width)
    time, data = mean.times[decaying], energy[decaying]
    if steady <= 0 or len(data) < 20 or np.count_nonzero(data) < 20:
        return refused(nominal, "nothing but silence in this band or after the switch-off")
    degrees = count * float(mean.bands.statistical_width[band]) * mean.frame_s
    one, two = _fits(data, time, degrees)
    return _band_decay(nominal, width, mean, time, data, steady, one, two, count)


def refused(nominal: float, reason: str, range_db: float = float("nan")) -> BandDecay:
    """A band without a figure."""
    nan = float("nan")
    empty = np.zeros(0)
    return BandDecay(
        nominal, nan, nan, nan, nan, nan, range_db, nan, nan, nan, nan, nan, nan, None, "", reason,
        nan, nan, (nan, nan), ("refused",), DecayCurve(empty, empty, empty, ()),
    )  # fmt: skip


def evaluate_integrated(
    energies: BandEnergies,
    band: int,
    time: Array,
    level: Array,
    total: float,
    noise: float,
    late_s: float,
) -> BandDecay:
    """Figures of one band from a backward-integrated decay.

    Parameters
    ----------
    energies, band
        What was integrated.
    time, level
        The integrated decay, NaN where there is none, shape ``(frame,)``. [s], [dB]
    total
        Energy of the whole decay. [squared pressure × s]
    noise
        Mean squared pressure of the noise.
    late_s
        Reverberation time of the late decay. [s]
    """
    nominal = energies.bands.nominal[band]
    width = float(energies.bands.width[band])
    # Interrupted noise in the same room and noise would show this range: the energy of the whole
    # decay against that of the noise over one decay constant.
    noise_part = max(noise * late_s / DECAY_CONSTANT, total * 1e-12)
    range_db = float(10.0 * np.log10(total / noise_part))
    good = np.isfinite(level)
    time, level = time[good], level[good]
    lines = standard_lines(time, level, level, range_db)
    times = {name: line.time_s if line else float("nan") for name, line in lines.items()}
    used = next((name for name in ("t30", "t20", "t15") if lines[name]), "")
    if not used:
        return refused(nominal, _short(range_db, "T15 needs 30 dB", 30.0), range_db)
    line = lines[used]
    assert line is not None
    t_s = line.time_s
    relative = 0.5 * np.sqrt(1.0 / (width * t_s))
    flags = list(_flags(t_s, width, range_db, None, relative, energies.reverse))
    curvature = 100.0 * (times["t30"] / times["t20"] - 1.0)
    if abs(curvature) > 10.0 or line.nonlinearity > 10.0:
        flags.append("curved")
    size = -(-len(time) // 400)
    curve = DecayCurve(
        grouped(time, size),
        grouped(level, size),
        np.full(len(time) // size, np.nan),
        _drawn(lines),
    )
    return BandDecay(
        band_hz=nominal,
        edt_s=times["edt"],
        t10_s=times["t10"],
        t15_s=times["t15"],
        t20_s=times["t20"],
        t30_s=times["t30"],
        range_db=range_db,
        level_db=float(10.0 * np.log10(total)),
        floor_db=float(10.0 * np.log10(noise_part)),
        curvature_percent=curvature,
        nonlinearity_permille=line.nonlinearity,
        whole_s=float("nan"),
        whole_u_s=float("nan"),
        two_slopes_s=None,
        used=used,
        reason=f"the longest range that stays {NOISE_MARGIN_DB:.0f} dB above the noise",
        t_s=t_s,
        u_s=t_s * relative,
        interval_s=(t_s * np.exp(-1.96 * relative), t_s * np.exp(1.96 * relative)),
        flags=tuple(flags),
        curve=curve,
    )


def _short(range_db: float, needs: str, needed: float) -> str:
    return (
        f"range {range_db:.0f} dB, {needs}: play {needed - range_db:.0f} dB louder or make the "
        f"room quieter by as much"
    )


def _drawn(lines: dict[str, Line | None]) -> tuple[tuple[str, float, float, float, float], ...]:
    return tuple(
        (name, line.start_s, line.start_db, line.end_s, line.end_db)
        for name, line in lines.items()
        if line
    )


def _steady(times: Array, energy: Array, width: float) -> float:
    """Mean squared pressure before the switch-off, clear of what the filter smears."""
    before = times < -0.5 * SETTLE / width
    if np.count_nonzero(before) < 10:
        before = times < 0
    return float(energy[before].mean())


def _fits(data: Array, time: Array, degrees: float) -> tuple[WholeDecay, WholeDecay | None]:
    """One exponential, and two where the likelihood clearly asks for them."""
    coarse = max(len(data) // 400, 1)
    fit = fit_whole_decay(grouped(data, coarse), grouped(time, coarse), degrees * coarse)
    step = float(time[1] - time[0])
    size = int(np.clip(float(fit.time_s[0]) / 30.0 / step, 1, max(len(data) // 40, 1)))
    part, at = grouped(data, size), grouped(time, size)
    one = fit_whole_decay(part, at, degrees * size)
    two = fit_whole_decay(part, at, degrees * size, slopes=2)
    return one, two if is_bent(one, two) else None


def is_bent(one: WholeDecay, two: WholeDecay) -> bool:
    """Whether two exponentials are needed: likelihood ratio, and a bend that matters."""
    ratio = float(one.deviance - two.deviance)
    apart = float(two.time_s[1] / two.time_s[0])
    return ratio > 12.0 and apart > 1.3


def _band_decay(
    nominal: float,
    width: float,
    mean: BandEnergies,
    time: Array,
    data: Array,
    steady: float,
    one: WholeDecay,
    two: WholeDecay | None,
    count: int,
) -> BandDecay:
    best = two or one
    floor = max(float(best.floor), steady * 1e-12)
    range_db = 10.0 * np.log10(steady / floor)
    estimate = float(one.time_s[0])
    size = max(int(estimate / 30.0 / mean.frame_s), 1)
    at = grouped(time, size)
    level = 10.0 * np.log10(np.maximum(grouped(data, size), 1e-300) / steady)
    located = 10.0 * np.log10(best.mean(at) / steady)
    lines = standard_lines(at, level, located, range_db)
    times = {name: line.time_s if line else float("nan") for name, line in lines.items()}
    chosen = lines["t30"] or lines["t20"] or lines["t15"]
    used, t_s, relative, reason = _choose(one, two, times, range_db)
    curve_at = mean.times > -0.2
    curve = _curve(
        mean.times[curve_at],
        mean.energy[curve_at, nominal_index(mean, nominal)],
        steady,
        best,
        lines,
    )
    return BandDecay(
        band_hz=nominal,
        edt_s=times["edt"],
        t10_s=times["t10"],
        t15_s=times["t15"],
        t20_s=times["t20"],
        t30_s=times["t30"],
        range_db=float(range_db),
        level_db=float(10.0 * np.log10(steady)),
        floor_db=float(10.0 * np.log10(floor)),
        curvature_percent=100.0 * (times["t30"] / times["t20"] - 1.0),
        nonlinearity_permille=chosen.nonlinearity if chosen else float("nan"),
        whole_s=estimate,
        whole_u_s=estimate * float(one.relative_u[0]),
        two_slopes_s=(float(two.time_s[0]), float(two.time_s[1])) if two else None,
        used=used,
        reason=reason,
        t_s=t_s,
        u_s=t_s * relative,
        interval_s=(t_s * np.exp(-1.96 * relative), t_s * np.exp(1.96 * relative)),
        flags=_flags(t_s, width, range_db, two, relative, mean.reverse),
        curve=curve,
    )


def nominal_index(mean: BandEnergies, nominal: float) -> int:
    """Where a band stands."""
    return mean.bands.nominal.index(nominal)


def _choose(
    one: WholeDecay, two: WholeDecay | None, times: dict[str, float], range_db: float
) -> tuple[str, float, float, str]:
    """Evaluation, time, relative standard uncertainty and the reason in words."""
    relative = float(one.relative_u[0])
    nan = float("nan")
    if range_db < LEAST_RANGE_DB:
        return "", nan, nan, _short(range_db, "T20 needs 35 dB", 35.0)
    if two is not None:
        for name in ("t30", "t20", "t15"):
            if np.isfinite(times[name]):
                return name, times[name], relative, "the decay is bent: line as in the standard"
    if not relative < 0.5:
        return "", nan, nan, "too few independent samples: record more decays"
    return "whole-decay", float(one.time_s[0]), relative, "straight decay: every frame used"


def _flags(
    t_s: float,
    width: float,
    range_db: float,
    two: WholeDecay | None,
    relative: float,
    reverse: bool,
) -> tuple[str, ...]:
    words = []
    if not np.isfinite(t_s):
        words.append("refused")
    if two is not None:
        words.append("bent")
    if range_db < 35.0:
        words.append("short-range")
    if width * t_s < (4.0 if reverse else 16.0):
        words.append("limited-by-filter")
    if relative > 0.1:
        words.append("few-decays")
    return tuple(words)


def _curve(
    time: Array, energy: Array, steady: float, fit: WholeDecay, lines: dict[str, Line | None]
) -> DecayCurve:
    size = -(-len(time) // 400)
    at = grouped(time, size)
    fitted = np.where(at > 0, 10.0 * np.log10(fit.mean(at) / steady), np.nan)
    level = 10.0 * np.log10(np.maximum(grouped(energy, size), 1e-300) / steady)
    return DecayCurve(at, level, fitted, _drawn(lines))
