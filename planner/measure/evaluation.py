"""Interrupted noise, band by band: whole-decay fits, lines of the standard, and which to use."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from planner.measure.bends import bend_of
from planner.measure.choice import FEW_DECAYS_U, LINE_SCATTER, NOT_NOISE, choose, value_to_use
from planner.measure.decay_fits import SETTLE, Fits, fit_bands, scatter_about
from planner.measure.figures import BandDecay, DecayCurve, refused
from planner.measure.filter_shape import decay_widening
from planner.measure.filterbank import BandEnergies
from planner.measure.lines import (
    CURVED_PERCENT,
    Line,
    drawn,
    grouped,
    longest,
    standard_lines,
    times_of,
)
from planner.measure.whole_decay import WholeDecay

Array = NDArray[np.float64]


def evaluate_bands(mean: BandEnergies, count: int) -> Iterator[BandDecay]:
    """Figures of every band from the ensemble average of `count` bursts."""
    fits = fit_bands(mean, count)
    for band in range(len(mean.bands)):
        fit = fits.get(band)
        if fit is None:
            reason = "nothing but silence in this band before or after the switch-off"
            yield refused(mean.bands.nominal[band], reason)
        else:
            yield _evaluate(mean, band, count, fit)


def _evaluate(mean: BandEnergies, band: int, count: int, fit: Fits) -> BandDecay:
    nominal, width = mean.bands.nominal[band], float(mean.bands.width[band])
    steady = _steady(mean.times, mean.energy[:, band], width)
    bend = bend_of(fit.one, fit.two, steady, float(fit.time[-1]))
    best = fit.two if bend.proven else fit.one
    floor = max(float(best.floor), steady * 1e-12)
    range_db = float(10.0 * np.log10(steady / floor))
    whole, relative = float(fit.one.time_s[0]), float(fit.one.relative_u[0])
    relative /= np.sqrt(decay_widening(width * whole)) if mean.reverse else 1.0
    fitted = relative
    lines = _lines(mean, fit, best, steady, range_db)
    times = times_of(lines)
    degrees = count * float(mean.bands.statistical_width[band]) * mean.frame_s
    scatter = scatter_about(best, fit, degrees)
    if scatter.irregular:
        relative *= float(np.sqrt(scatter.relative))
    if scatter.hopeless:
        used, reason = "", NOT_NOISE
    else:
        used, reason = choose(lines, range_db, relative, fit.two if bend.proven else None, count)
    t_s, relative = value_to_use(used, times, whole, relative, bend.doubt, count * width)
    shown = longest(lines)
    line = lines[shown] if shown else None
    flags = [word for word, doubt in (
        ("refused", not used),
        ("bent", bend.flagged),
        ("curved", not bend.flagged and _curved(times, count * width)),
        ("irregular", scatter.irregular),
        ("short-range", range_db < 35.0),
        ("limited-by-filter", width * t_s < (4.0 if mean.reverse else 16.0)),
        ("few-decays", bool(used) and relative > FEW_DECAYS_U),
    ) if doubt]  # fmt: skip
    return BandDecay(
        band_hz=nominal,
        edt_s=times["edt"],
        t10_s=times["t10"],
        t15_s=times["t15"],
        t20_s=times["t20"],
        t30_s=times["t30"],
        range_db=range_db,
        level_db=float(10.0 * np.log10(steady)),
        floor_db=float(10.0 * np.log10(floor)),
        curvature_percent=100.0 * (times["t30"] / times["t20"] - 1.0),
        nonlinearity_permille=line.nonlinearity if line else float("nan"),
        whole_s=whole,
        whole_u_s=whole * fitted,
        two_slopes_s=(float(fit.two.time_s[0]), float(fit.two.time_s[1])) if bend.flagged else None,
        used=used,
        reason=reason,
        t_s=t_s,
        u_s=t_s * relative,
        interval_s=(t_s * np.exp(-1.96 * relative), t_s * np.exp(1.96 * relative)),
        flags=tuple(flags),
        curve=_curve(mean, band, steady, best, lines),
    )


def _steady(times: Array, energy: Array, width: float) -> float:
    """Mean squared pressure before the switch-off, clear of what the filter smears."""
    before = times < -0.5 * SETTLE / width
    if np.count_nonzero(before) < 10:
        before = times < 0.0
    return float(max(energy[before].mean(), 1e-300))


def _lines(
    mean: BandEnergies, fit: Fits, best: WholeDecay, steady: float, range_db: float
) -> dict[str, Line | None]:
    """Lines on the averaged levels, between the times at which the fitted curve has the levels.

    Fluctuations then do not decide where a range begins and ends. Levels are means over a
    thirtieth of the reverberation time (a detector may take a twelfth of it).
    """
    size = max(int(float(fit.one.time_s[0]) / 30.0 / mean.frame_s), 1)
    size = min(size, max(len(fit.time) // 20, 1))
    at = grouped(fit.time, size)
    level = 10.0 * np.log10(np.maximum(grouped(fit.energy, size), 1e-300) / steady)
    return standard_lines(at, level, 10.0 * np.log10(best.mean(at) / steady), range_db)


def _curved(times: dict[str, float], samples: float) -> bool:
    """T20 and T30 apart by more than a tenth, and by more than chance."""
    t20, t30 = times["t20"], times["t30"]
    if not (np.isfinite(t20) and np.isfinite(t30)):
        return False
    chance = 300.0 * LINE_SCATTER["t20"] / np.sqrt(samples * t30)
    return bool(abs(100.0 * (t30 / t20 - 1.0)) > max(CURVED_PERCENT, chance))


def _curve(
    mean: BandEnergies, band: int, steady: float, fit: WholeDecay, lines: dict[str, Line | None]
) -> DecayCurve:
    shown = mean.times > -0.3
    size = -(-int(np.count_nonzero(shown)) // 400)
    at = grouped(mean.times[shown], size)
    energy = grouped(mean.energy[shown, band], size)
    fitted = np.full(len(at), np.nan)
    fitted[at > 0] = 10.0 * np.log10(fit.mean(at[at > 0]) / steady)
    level = 10.0 * np.log10(np.maximum(energy, 1e-300) / steady)
    return DecayCurve(at, level, fitted, drawn(lines))
