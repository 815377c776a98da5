"""Charts for deciding: options side by side, and what less deviation costs."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.bands import OCTAVES
from planner.report.band_layers import axis_top
from planner.report.band_series import Series, TargetSteps
from planner.report.chart import Chart, Spec, finished, number, numbers, shortened
from planner.report.charts_bands import reverberation
from planner.report.palette import STYLES


def side_by_side(
    options: Sequence[Series],
    target: TargetSteps | None = None,
    *,
    untreated: Series | None = None,
    bands_hz: Sequence[float] = OCTAVES,
    width: float = 250,
    height: float = 170,
) -> list[Chart]:
    """One small chart per option, all with the same axes.

    Parameters
    ----------
    options
        One series per option, any number; their looks are not used.
    target
        Limits per band of `bands_hz`.
    untreated
        Shown in every chart for comparison.
    bands_hz
        Nominal midbands of the last axis. [Hz]
    width, height
        Size of each plot. [px]
    """
    every = [*options, *([untreated] if untreated is not None else [])]
    top = axis_top(every, target)
    charts = []
    for option in options:
        shown = [
            Series(
                option.name,
                option.values,
                "option-a",
                option.low,
                option.high,
                option.interval,
                option.assumed_hz,
            )
        ]
        if untreated is not None:
            shown.insert(0, Series(untreated.name, untreated.values, "untreated"))
        charts.append(
            reverberation(
                shown,
                target,
                bands_hz=bands_hz,
                title=option.name,
                highest=top,
                notes=False,
                width=width,
                height=height,
            )
        )
    return charts


def front(
    cost: ArrayLike,
    deviation_s: ArrayLike,
    *,
    currency: str = "",
    chosen: int | None = None,
    labels: Sequence[str] = (),
    title: str = "What less deviation costs",
    width: float = 520,
    height: float = 240,
) -> Chart:
    """The cheapest cost for each largest deviation from the target, as steps.

    Parameters
    ----------
    cost
        Cost of each proven-cheapest treatment, shape ``(point,)``. [currency]
    deviation_s
        Its largest deviation outside the target over all bands, same shape; 0 is inside. [s]
    currency
        Unit of the cost.
    chosen
        Which point is the chosen treatment.
    labels
        What each treatment is called; shown in the table and on pointing.
    title
        Heading.
    width, height
        Size of the plot. [px]
    """
    price, miss = np.asarray(cost, float), np.asarray(deviation_s, float)
    order = np.argsort(price, kind="stable")
    names = [str(label) for label in labels] or [f"treatment {n + 1}" for n in range(len(price))]
    rows = [
        {
            "cost": number(price[n], 2),
            "miss": number(miss[n], 4),
            "label": shortened(names[n], 60),
            "chosen": bool(n == chosen),
        }
        for n in order
        if np.isfinite(price[n]) and np.isfinite(miss[n])
    ]
    unit = f" ({currency})" if currency else ""
    x: Spec = {
        "field": "cost",
        "type": "quantitative",
        "scale": {"domain": _cost_domain(price), "nice": False},
        "axis": {"title": f"Cost{unit}", "grid": False, "format": ",.0f", "tickCount": 6},
    }
    y: Spec = {
        "field": "miss",
        "type": "quantitative",
        "scale": {"domainMin": 0},
        "axis": {"title": "Largest deviation outside the target (s)", "format": ".2f"},
    }
    colour = STYLES["untreated"].colour
    layers: list[Spec] = [
        {
            "data": {"values": rows},
            "layer": [
                {
                    "mark": {
                        "type": "line",
                        "interpolate": "step-after",
                        "color": colour,
                        "strokeWidth": 2,
                    },
                    "encoding": {"x": x, "y": y},
                },
                {
                    "mark": {"type": "point", "filled": True, "opacity": 1, "color": colour},
                    "encoding": {
                        "x": x,
                        "y": y,
                        "size": {"condition": {"test": "datum.chosen", "value": 160}, "value": 55},
                        "shape": {
                            "condition": {"test": "datum.chosen", "value": "square"},
                            "value": "triangle-up",
                        },
                        "tooltip": [
                            {"field": "label", "title": "treatment", "type": "nominal"},
                            {"field": "cost", "title": f"cost{unit}", "format": ",.2f"},
                            {"field": "miss", "title": "deviation (s)", "format": ".3f"},
                        ],
                    },
                },
                {
                    "transform": [{"filter": "datum.chosen"}],
                    "mark": {
                        "type": "text",
                        "text": "chosen",
                        "align": "left",
                        "dx": 10,
                        "dy": -10,
                        "color": {"expr": "ink"},
                    },
                    "encoding": {"x": x, "y": y},
                },
            ],
        }
    ]
    return finished(
        layers,
        title=title,
        description=_front_sentence(price, miss, currency),
        columns={
            "treatment": names,
            f"cost{unit}": numbers(price, 2),
            "largest deviation outside the target (s)": numbers(miss, 4),
        },
        width=width,
        height=height,
    )


def _cost_domain(price: NDArray[np.float64]) -> list[float]:
    finite = price[np.isfinite(price)]
    if not finite.size:
        return [0.0, 1.0]
    low, high = float(finite.min()), float(finite.max())
    margin = max(0.06 * (high - low), 0.02 * high, 1.0)
    return [max(low - margin, 0.0), high + margin]


def _front_sentence(price: ArrayLike, miss: ArrayLike, currency: str) -> str:
    cost, away = np.asarray(price, float), np.asarray(miss, float)
    known = np.flatnonzero(np.isfinite(cost) & np.isfinite(away))
    if not known.size:
        return "No treatment was found."
    nearest = known[np.lexsort((cost[known], np.round(away[known], 6)))[0]]
    cheapest = known[np.argmin(cost[known])]
    return (
        f"The nearest to the target costs {cost[nearest]:,.0f} {currency} and is at most "
        f"{away[nearest]:.2f} s outside; the cheapest shown costs {cost[cheapest]:,.0f} "
        f"{currency} and is at most {away[cheapest]:.2f} s outside."
    )
