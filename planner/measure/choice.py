"""Which of several evaluations of one decay is to be used, how sure it is, and why."""

from __future__ import annotations

import numpy as np

from planner.measure.lines import LADDER, Line, longest
from planner.measure.whole_decay import WholeDecay

LEAST_RANGE_DB = 15.0
"""Under this range above the noise even the whole-decay fit, which carries the noise in its model,
is refused: less than the range of T10 would be seen. [dB]"""

LARGEST_U = 0.5
"""Relative standard uncertainty above which a time says nothing. [-]"""

FEW_DECAYS_U = 0.10
"""Relative standard uncertainty above which more decays are asked for. [-]"""

NOT_NOISE = (
    "what follows the switch-off is not a decay of noise: a gate or gain control in the recorder, "
    "a slammed door, speech, or the very same noise in every burst; switch such functions off, "
    "leave that burst out or record again"
)
"""The reason then."""

LINE_SCATTER = {"t30": 0.55 * 1.52**0.5, "t20": 0.88 * 1.90**0.5, "t15": 1.36 * 1.90**0.5}
"""Relative standard deviation of a line is this over sqrt(n·B·T): the part of ISO 3382-2:2008,
annex A, that more decays reduce; T15 scaled from T20 by the range to the power 3/2. [-]"""


def short_range(range_db: float, name: str, needed: float) -> str:
    """The reason in dB, and what to change on site."""
    return (
        f"range {range_db:.0f} dB above the noise, {name} needs {needed:.0f} dB: "
        f"{needed - range_db:.0f} dB louder, or the room quieter by as much"
    )


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
