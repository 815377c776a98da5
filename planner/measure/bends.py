"""Is a decay straight? What two exponentials say against one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from planner.measure.lines import RANGES, line_between
from planner.measure.whole_decay import WholeDecay

BEND_RATIO = 9.21
"""Twice the log-likelihood gained by a second slope before it is believed: 99 % point of χ² with
two degrees of freedom; single slopes exceed it about once in a hundred. [-]"""

BEND_SIZE = 0.10
"""Early and late times differ by more than this before a band is called bent: a curvature above
10 % is suspicious (ISO 3382-2:2008, B.3). [-]"""


@dataclass(frozen=True, slots=True)
class Bend:
    """How far a decay is from one exponential."""

    proven: bool
    """The likelihood asks for a second slope."""
    size: float
    """Late time (−15 dB to 5 dB above the noise) over early time (−5 to −15 dB), less 1. [-]"""
    doubt: float
    """Relative standard uncertainty of a single time because the decay may be bent. [-]"""

    @property
    def flagged(self) -> bool:
        """Whether the band is to be called bent."""
        return self.proven and self.size > BEND_SIZE


def bend_of(one: WholeDecay, two: WholeDecay, steady: float, end_s: float) -> Bend:
    """Compare the fits of one and two exponentials to the same decay.

    Parameters
    ----------
    one, two
        The fits of a single decay.
    steady
        Level before the switch-off, as squared pressure.
    end_s
        End of the fitted frames. [s]

    Notes
    -----
    The doubt is the difference between the single time and the standard's line on the curve of
    two exponentials, times the square root of the second model's Akaike weight,
    1/(1 + exp(2 − Λ/2)) with Λ twice the log-likelihood gained by two more parameters.

    References
    ----------
    .. [1] K. P. Burnham, D. R. Anderson, *Model Selection and Multimodel Inference*, 2nd ed.,
       Springer 2002, section 4.3: variance from the choice between models.
    """
    gained = float(one.deviance - two.deviance)
    single = float(one.time_s[0])
    time = np.linspace(0.0, end_s, 400)
    curve = 10.0 * np.log10((two.mean(time) - two.floor) / steady + 1e-30)
    above = -10.0 * np.log10(max(float(two.floor) / steady, 1e-12))
    early = line_between(time, curve, curve, -5.0, -15.0)
    late = line_between(time, curve, curve, -15.0, -max(above - 5.0, 25.0))
    size = float(two.time_s[1] / two.time_s[0]) - 1.0
    if early is not None and late is not None:
        size = max(late.time_s, single) / early.time_s - 1.0
    name = "t30" if above > 40.0 else "t20"
    line = line_between(time, curve, curve, *RANGES[name])
    weight = 1.0 / (1.0 + np.exp(2.0 - 0.5 * np.clip(gained, 0.0, 100.0)))
    apart = abs(line.time_s / single - 1.0) if line is not None else 0.0
    return Bend(gained > BEND_RATIO, size, float(np.sqrt(weight) * min(apart, 1.0)))
