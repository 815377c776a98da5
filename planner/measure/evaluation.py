"""Interrupted noise, band by band: whole-decay fits, lines of the standard, and which to use."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.measure.bends import bend_of
from planner.measure.figures import BandDecay, DecayCurve
from planner.measure.filterbank import BandEnergies
from planner.measure.lines import (
    CURVED_PERCENT,
    LADDER,
    Line,
    grouped,
    longest,
    standard_lines,
    times_of,
)
from planner.measure.whole_decay import WholeDecay, fit_whole_decay

Array = NDArray[np.float64]

LEAST_RANGE_DB = 15.0
"""Under this range above the noise even the whole-decay fit, which carries the noise in its model,
is refused: less than the range of T10 would be seen. [dB]"""

GUARD_S = 0.003
"""Skipped after the switch-off, whose place is known to 2 ms. [s]"""

SETTLE = 5.0
"""A filter has rung down by 60 dB after this over its width. [-]"""

LARGEST_U = 0.5
"""Relative standard uncertainty above which a time says nothing. [-]"""

FEW_DECAYS_U = 0.10
"""Relative standard uncertainty above which more decays are asked for. [-]"""

REGULAR_DEGREES = 4.0
"""Independent complex samples in a frame when the scatter about a fit is judged. [-]"""

HOPELESS = 3.0
"""Scatter about a fit, over that of noise, above which no figure is given. [-]"""

NOT_NOISE = (
    "what follows the switch-off is not a decay of noise: a gate or gain control in the recorder, "
    "a slammed door, speech; switch such functions off, leave that burst out or record again"
)
"""The reason then."""

LINE_SCATTER = {"t30": 0.55 * 1.52**0.5, "t20": 0.88 * 1.90**0.5, "t15": 1.36 * 1.90**0.5}
"""Relative standard deviation of a line is this over sqrt(n·B·T): the part of ISO 3382-2:2008,
annex A, that more decays reduce; T15 scaled from T20 by the range to the power 3/2. [-]"""


@dataclass(frozen=True, slots=True)
class Fits:
    """The whole-decay fits of one band, and the frames they used."""

    time: Array
    energy: Array
    one: WholeDecay
    two: WholeDecay


def evaluate_bands(mean: BandEnergies, count: int) -> Iterator[BandDecay]:
    """Figures of every band from the ensemble average of `count` bursts."""
    fits = _fit_bands(mean, count)
    for band in range(len(mean.bands)):
        fit = fits.get(band)
        if fit is None:
            reason = "nothing but silence in this band before or after the switch-off"
            yield refused(mean.bands.nominal[band], reason)
        else:
            yield _evaluate(mean, band, count, fit)


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


def short_range(range_db: float, name: str, needed: float) -> str:
    """The reason in dB, and what to change on site."""
    return (
        f"range {range_db:.0f} dB above the noise, {name} needs {needed:.0f} dB: "
        f"{needed - range_db:.0f} dB louder, or the room quieter by as much"
    )


def _fit_bands(mean: BandEnergies, count: int) -> dict[int, Fits]:
    """Whole-decay fits; bands that need the same frames are fitted in one go."""
    windows = defaultdict(list)
    for band, width in enumerate(mean.bands.width):
        last = mean.times[-1] - SETTLE / width
        inside = np.flatnonzero((mean.times > GUARD_S) & (mean.times < last))
        if len(inside) >= 40 and np.count_nonzero(mean.energy[inside, band]) >= 40:
            windows[(int(inside[0]), int(inside[-1]) + 1)].append(band)
    fits: dict[int, Fits] = {}
    for (first, last), members in windows.items():
        fits |= _fit_window(mean, count, slice(first, last), np.array(members))
    return fits


def _fit_window(
    mean: BandEnergies, count: int, window: slice, members: NDArray[np.intp]
) -> dict[int, Fits]:
    time, energy = mean.times[window], mean.energy[window][:, members]
    degrees = count * mean.bands.statistical_width[members] * mean.frame_s
    coarse = max(len(time) // 300, 1)
    rough = fit_whole_decay(grouped(energy, coarse), grouped(time, coarse), degrees * coarse)
    wanted = rough.time_s[0] / 40.0 / mean.frame_s
    sizes = np.clip(wanted, 1, max(len(time) // 40, 1)).astype(int)
    ends = np.minimum(_enough(rough, float(time[-1])) / mean.frame_s, len(time)).astype(int)
    fits = {}
    for size, end in set(zip(sizes.tolist(), ends.tolist(), strict=True)):
        chosen = np.flatnonzero((sizes == size) & (ends == end))
        at, part = grouped(time[:end], size), grouped(energy[:end, chosen], size)
        one = fit_whole_decay(part, at, degrees[chosen] * size)
        two = fit_whole_decay(part, at, degrees[chosen] * size, slopes=2, single=one)
        for place, index in enumerate(chosen):
            fits[int(members[index])] = Fits(
                time[:end], energy[:end, index], one.decay(place), two.decay(place)
            )
    return fits


def _enough(rough: WholeDecay, longest_s: float) -> Array:
    """How much of the time after the switch-off is to be fitted. [s].

    Three times until the decay meets the noise, and a second of noise at least: what happens
    later says nothing about the decay. Rounded up to a few lengths, so that bands share a fit.
    """
    with np.errstate(divide="ignore", over="ignore"):
        meets = rough.time_s[0] / 6.0 * np.log10(np.maximum(rough.amplitude[0] / rough.floor, 1.0))
    needed = np.clip(np.maximum(3.0 * meets, meets + 1.0), 1.0, longest_s)
    rounded: Array = 1.25 ** np.ceil(np.log(needed) / np.log(1.25))
    return rounded


def _evaluate(mean: BandEnergies, band: int, count: int, fit: Fits) -> BandDecay:
    nominal, width = mean.bands.nominal[band], float(mean.bands.width[band])
    steady = _steady(mean.times, mean.energy[:, band], width)
    bend = bend_of(fit.one, fit.two, steady, float(fit.time[-1]))
    best = fit.two if bend.proven else fit.one
    floor = max(float(best.floor), steady * 1e-12)
    range_db = float(10.0 * np.log10(steady / floor))
    whole, relative = float(fit.one.time_s[0]), float(fit.one.relative_u[0])
    lines = _lines(mean, fit, best, steady, range_db)
    times = times_of(lines)
    degrees = count * float(mean.bands.statistical_width[band]) * mean.frame_s
    scatter, irregular = scatter_about(best, fit, degrees)
    if irregular:
        relative *= float(np.sqrt(scatter))
    if irregular and scatter > HOPELESS:
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
        ("irregular", irregular),
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
        whole_u_s=whole * float(fit.one.relative_u[0]),
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


def scatter_about(best: WholeDecay, fit: Fits, degrees: float) -> tuple[float, bool]:
    """Mean square of the scatter about a fit over what noise alone gives; whether it is too much.

    A gate, a slammed door, a recorder that rides its gain leave more than fluctuating noise can.
    Pearson's statistic of gamma variates with `degrees` independent complex samples in a frame;
    five of its standard deviations, sqrt((2 + 6/degrees)/frames), count as too much.
    """
    size = min(max(int(np.ceil(REGULAR_DEGREES / degrees)), 1), len(fit.energy) // 4)
    ratio = grouped(fit.energy, size) / grouped(best.mean(fit.time), size)
    scatter = float(np.mean((ratio - 1.0) ** 2) * degrees * size)
    spread = np.sqrt((2.0 + 6.0 / (degrees * size)) / len(ratio))
    return scatter, scatter > 1.0 + 5.0 * spread


def choose(
    lines: dict[str, Line | None],
    range_db: float,
    relative: float,
    slopes: WholeDecay | None,
    count: int,
) -> tuple[str, str]:
    """Which evaluation is to be used, and the reason in words.

    Parameters
    ----------
    lines
        The evaluations of the standard.
    range_db
        Steady level above the noise. [dB]
    relative
        Relative standard uncertainty of the whole-decay fit. [-]
    slopes
        Two exponentials where the likelihood asks for them.
    count
        Bursts averaged.
    """
    if range_db < LEAST_RANGE_DB:
        return "", short_range(range_db, "T20", 35.0)
    if relative > LARGEST_U:
        more = max(int(np.ceil(count * (relative / 0.25) ** 2)) - count, 1)
        return "", (
            f"too few independent samples in so short a decay: standard uncertainty "
            f"{100 * relative:.0f} %, {more} more decays would make it 25 %"
        )
    if slopes is not None:
        name = longest(lines)
        line = lines[name] if name else None
        if line is None:
            return "", "the decay is not straight, and " + short_range(range_db, "T15", 30.0)
        if 0.8 * slopes.time_s[0] < line.time_s < 1.25 * slopes.time_s[1]:
            return name, f"the decay is not straight: {name.upper()} as the standard defines it"
        return (
            "whole-decay",
            "the decay seems not straight, but too few decays fluctuate too much for a line",
        )
    reason = "straight decay: every frame counts, the noise floor is part of the fit"
    if relative > FEW_DECAYS_U:
        more = int(np.ceil(count * (relative / FEW_DECAYS_U) ** 2)) - count
        reason += f"; {more} more decays bring the standard uncertainty under 10 %"
    return "whole-decay", reason


def value_to_use(
    used: str, times: dict[str, float], whole: float, relative: float, doubt: float, samples: float
) -> tuple[float, float]:
    """The time [s] and its relative standard uncertainty.

    Parameters
    ----------
    used, times, whole
        The evaluation chosen, the lines of the standard and the whole-decay fit. [s]
    relative
        Relative standard uncertainty of the whole-decay fit.
    doubt
        Relative standard uncertainty because the decay may be bent, see `bends`.
    samples
        Number of decays times bandwidth. [1/s]
    """
    if not used:
        return float("nan"), float("nan")
    if used == "whole-decay":
        # The estimate is even in ln T, so its mean in T lies higher by half the variance.
        corrected = whole / (1.0 + 0.5 * relative**2)
        doubt = max(doubt, _disagreement(times, whole, relative, samples))
        return corrected, float(np.hypot(relative, doubt))
    t_s = times[used]
    others = [times[name] for name in LADDER if np.isfinite(times[name])]
    spread = (max(others) - min(others)) / t_s / np.sqrt(12.0)
    return t_s, float(np.hypot(LINE_SCATTER[used] / np.sqrt(samples * t_s), spread))


def _disagreement(times: dict[str, float], whole: float, relative: float, samples: float) -> float:
    """What the longest line differs from the whole-decay fit beyond chance, relative.

    An efficient estimate does not correlate with its difference from another one of the same
    truth: the variance of that difference is the difference of the variances (J. A. Hausman,
    Econometrica 46 (1978) 1251).
    """
    name = next((name for name in LADDER if np.isfinite(times[name])), "")
    if not name:
        return 0.0
    scatter = LINE_SCATTER[name] / np.sqrt(samples * whole)
    if scatter > 0.2:
        return 0.0
    chance = max(scatter**2 - relative**2, 0.0)
    return float(np.sqrt(max(np.log(times[name] / whole) ** 2 - chance, 0.0)))


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


def drawn(lines: dict[str, Line | None]) -> tuple[tuple[str, float, float, float, float], ...]:
    """The lines as a chart takes them."""
    return tuple(
        (name, line.start_s, line.start_db, line.end_s, line.end_db)
        for name, line in lines.items()
        if line
    )
