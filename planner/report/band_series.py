"""What a chart over bands is given: series with their looks, and the target's limits."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.report.chart import shortened
from planner.report.palette import STYLES

MOST_SERIES = len(STYLES)


class TargetSteps(Protocol):
    """Limits per band, as `planner.predict.targets` gives them; NaN where there is none."""

    @property
    def name(self) -> str:
        """What the target is called."""

    @property
    def low(self) -> Any:
        """Lower limit, shape ``(band,)``. [s]."""

    @property
    def high(self) -> Any:
        """Upper limit, shape ``(band,)``. [s]."""


@dataclass(frozen=True, slots=True)
class Series:
    """One line of a band chart."""

    name: str
    values: ArrayLike
    """Shape ``(band,)``; NaN leaves a gap."""
    look: str = "untreated"
    """Which of the fixed styles: ``untreated``, ``option-a``, ``option-b`` or ``measured``."""
    low: ArrayLike | None = None
    """Lower end of the interval, shape ``(band,)``."""
    high: ArrayLike | None = None
    """Upper end of the interval, shape ``(band,)``."""
    interval: str = "95 % interval"
    """What the interval is, in words."""
    assumed_hz: Sequence[float] = ()
    """Bands that rest on an assumption; their markers are hollow. [Hz]"""

    def array(self) -> NDArray[np.float64]:
        """The values as floats."""
        return np.asarray(self.values, float)


def in_order(series: Sequence[Series]) -> list[Series]:
    """The series in their fixed order, with names that differ."""
    if not 1 <= len(series) <= MOST_SERIES:
        raise ValueError(f"a chart shows 1 to {MOST_SERIES} series, not {len(series)}")
    looks = [one.look for one in series]
    if len(set(looks)) != len(looks) or not set(looks) <= set(STYLES):
        raise ValueError(f"each series needs a look of its own out of {list(STYLES)}, not {looks}")
    order = list(STYLES)
    named: list[Series] = []
    for one in sorted(series, key=lambda entry: order.index(entry.look)):
        name, count = shortened(one.name, 60) or one.look, 1
        while any(name == other.name for other in named):
            count += 1
            name = f"{shortened(one.name, 55)} ({count})"
        named.append(
            Series(name, one.values, one.look, one.low, one.high, one.interval, one.assumed_hz)
        )
    return named


def limits_of(target: TargetSteps) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Lower and upper limits as floats, NaN where there is none."""
    return np.asarray(target.low, float), np.asarray(target.high, float)
