"""The frequency axis of charts that have no bands."""

from __future__ import annotations

from planner.report.chart import Spec

TICKS = (10, 16, 20, 25, 31.5, 40, 50, 63, 80, 100, 125, 160, 200, 250, 315, 400, 500, 630, 800)


def hz_axis(low: float, high: float) -> Spec:
    """Base-two logarithm from `low` to `high`, ticks at preferred frequencies. [Hz]."""
    return {
        "type": "quantitative",
        "scale": {
            "type": "log",
            "base": 2,
            "domain": [round(low, 3), round(high, 3)],
            "nice": False,
        },
        "axis": {
            "title": "Frequency (Hz)",
            "values": [tick for tick in TICKS if low <= tick <= high],
            "grid": False,
            "format": "~r",
            "labelOverlap": True,
        },
    }
