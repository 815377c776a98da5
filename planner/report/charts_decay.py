"""The chart of one decay: level against time, with the evaluated range, the fit and the floor."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from planner.report.chart import Chart, Spec, finished, number, thinned
from planner.report.palette import STYLES

MOST_POINTS = 250
MOST_FITTED = 100


@dataclass(frozen=True, slots=True)
class DecayCurve:
    """A decay as it was evaluated."""

    time_s: ArrayLike
    """From the switch-off. [s]"""
    level_db: ArrayLike
    """Relative to the steady level, same shape. [dB]"""
    range_db: tuple[float, float] | None = None
    """Levels between which the line was fitted, for example ``(-5, -25)``. [dB]"""
    slope_db_per_s: float | None = None
    """Slope of the fitted line. [dB/s]"""
    start_db: float = 0.0
    """Level of the fitted line at the switch-off. [dB]"""
    floor_db: float | None = None
    """Background noise relative to the steady level. [dB]"""
    label: str = "T"
    """Which evaluation, for example ``T20``."""
    fitted_db: ArrayLike | None = None
    """A fitted curve instead of a line, shape of `time_s`; NaN where it is not drawn. [dB]"""
    t_s: float | None = None
    """The time to print where it is not that of the line. [s]"""

    @property
    def reverberation_time(self) -> float:
        """Time for 60 dB along the fitted line (or `t_s`), NaN without one. [s]."""
        if self.t_s is not None:
            return self.t_s
        return self.line_time

    @property
    def line_time(self) -> float:
        """Time for 60 dB along the fitted line, NaN without a line. [s]."""
        if not self.slope_db_per_s or self.slope_db_per_s >= 0:
            return float("nan")
        return -60.0 / self.slope_db_per_s


def decay(
    curve: DecayCurve,
    *,
    title: str = "Decay",
    lowest_db: float = -70.0,
    width: float = 520,
    height: float = 260,
) -> Chart:
    """Decay curve with the evaluated range shaded, the fitted line and the noise floor.

    Parameters
    ----------
    curve
        Levels and what was fitted to them.
    title
        Heading, for example the file and the band.
    lowest_db
        Lower end of the level axis. [dB]
    width, height
        Size of the plot. [px]
    """
    time, level = np.asarray(curve.time_s, float), np.asarray(curve.level_db, float)
    keep = thinned(len(time), MOST_POINTS)
    rows = [
        {"t": number(t, 5), "level": number(max(value, lowest_db), 2)}
        for t, value in zip(time[keep], level[keep], strict=True)
        if np.isfinite(value)
    ]
    span = (float(time[0]), float(time[-1])) if len(time) else (0.0, 1.0)
    x: Spec = {
        "field": "t",
        "type": "quantitative",
        "scale": {"domain": [round(span[0], 4), round(span[1], 4)], "nice": False},
        "axis": {"title": "Time from the switch-off (s)", "grid": False, "tickCount": 8},
    }
    y: Spec = {
        "field": "level",
        "type": "quantitative",
        "scale": {"domain": [lowest_db, 5.0], "nice": False},
        "axis": {
            "title": "Level re steady level (dB)",
            "values": list(range(int(lowest_db), 6, 10)),
            "labelExpr": "replace(datum.label, '-', '−')",
        },
    }
    line: Spec = {
        "data": {"values": rows},
        "mark": {"type": "line", "strokeWidth": 1.5, "color": STYLES["untreated"].colour},
        "encoding": {"x": x, "y": y},
    }
    layers = [*_evaluated(curve, span, x, y), line, *_fit(curve, lowest_db, x, y)]
    layers += _floor(curve, lowest_db, x, y)
    return finished(
        layers,
        title=title,
        subtitle=[_words(curve)],
        description=f"{title}: {_sentence(curve)}",
        columns={
            "time (s)": [row["t"] for row in rows],
            "level re steady level (dB)": [row["level"] for row in rows],
        },
        width=width,
        height=height,
    )


def _words(curve: DecayCurve) -> str:
    parts = []
    time = curve.reverberation_time
    if np.isfinite(time):
        parts.append(f"{curve.label} = {time:.2f} s (dashed line)")
    else:
        parts.append("no reverberation time can be read")
    if curve.range_db is not None:
        parts.append(f"evaluated {_db(curve.range_db[0])} to {_db(curve.range_db[1])} (shaded)")
    if curve.floor_db is not None:
        parts.append(f"noise floor {_db(curve.floor_db)} (dotted line)")
    return "; ".join(parts)


def _sentence(curve: DecayCurve) -> str:
    words = _words(curve)
    for mark in (" (dashed line)", " (shaded)", " (dotted line)"):
        words = words.replace(mark, "")
    return f"{words}."


def _db(level: float) -> str:
    return f"{level:.0f} dB".replace("-", "−")


def _evaluated(curve: DecayCurve, span: tuple[float, float], x: Spec, y: Spec) -> list[Spec]:
    if curve.range_db is None:
        return []
    row = {"t": span[0], "end": span[1], "level": max(curve.range_db), "low": min(curve.range_db)}
    if np.isfinite(curve.line_time):
        slope = float(curve.slope_db_per_s or 0.0)
        row["t"] = max((max(curve.range_db) - curve.start_db) / slope, span[0])
        row["end"] = min((min(curve.range_db) - curve.start_db) / slope, span[1])
    return [
        {
            "data": {"values": [{name: round(value, 4) for name, value in row.items()}]},
            "mark": {"type": "rect", "color": {"expr": "zone"}, "opacity": 0.22, "clip": True},
            "encoding": {"x": x, "x2": {"field": "end"}, "y": y, "y2": {"field": "low"}},
        }
    ]


def _fit(curve: DecayCurve, lowest_db: float, x: Spec, y: Spec) -> list[Spec]:
    if curve.fitted_db is not None:
        time, level = np.asarray(curve.time_s, float), np.asarray(curve.fitted_db, float)
        shown = np.flatnonzero(np.isfinite(level) & (level >= lowest_db))
        keep = shown[thinned(len(shown), MOST_FITTED)]
        values = [{"t": number(time[i], 5), "level": number(level[i], 3)} for i in keep]
        return [_straight(values, STYLES["option-a"].colour, [6, 3], 2.0, x, y)] if values else []
    if not np.isfinite(curve.line_time):
        return []
    slope = float(curve.slope_db_per_s or 0.0)
    ends = [0.0, (lowest_db - curve.start_db) / slope]
    values = [{"t": round(t, 5), "level": round(curve.start_db + slope * t, 3)} for t in ends]
    return [_straight(values, STYLES["option-a"].colour, [6, 3], 2.0, x, y)]


def _floor(curve: DecayCurve, lowest_db: float, x: Spec, y: Spec) -> list[Spec]:
    if curve.floor_db is None or not np.isfinite(curve.floor_db):
        return []
    domain = x["scale"]["domain"]
    level = round(max(curve.floor_db, lowest_db), 2)
    values = [{"t": t, "level": level} for t in domain]
    return [_straight(values, STYLES["measured"].colour, [2, 2], 1.5, x, y)]


def _straight(
    values: list[Any], colour: str, dash: list[int], width: float, x: Spec, y: Spec
) -> Spec:
    return {
        "data": {"values": values},
        "mark": {
            "type": "line",
            "color": colour,
            "strokeDash": dash,
            "strokeWidth": width,
            "clip": True,
        },
        "encoding": {"x": x, "y": y},
    }
