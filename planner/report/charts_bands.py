"""Charts over frequency bands: reverberation times and absorption coefficients."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import ArrayLike

from planner.bands import OCTAVES
from planner.report.band_layers import (
    axis_top,
    largest_value,
    rounded_up,
    series_layers,
    target_layers,
    tick_step,
)
from planner.report.band_series import Series, TargetSteps, in_order
from planner.report.band_words import columns_of, notes_on, sentences
from planner.report.chart import Chart, Spec, finished, numbers


def reverberation(
    series: Sequence[Series],
    target: TargetSteps | None = None,
    *,
    bands_hz: Sequence[float] = OCTAVES,
    quantity: str = "Reverberation time",
    title: str | None = None,
    highest: float | None = None,
    notes: bool = True,
    width: float = 520,
    height: float = 260,
) -> Chart:
    """Reverberation time per band, up to four series, against the target's tolerance steps.

    Parameters
    ----------
    series
        One to four series, each with a look of its own.
    target
        Limits per band of `bands_hz`; nothing is drawn where a limit is NaN.
    bands_hz
        Nominal midbands of the last axis. [Hz]
    quantity
        What the vertical axis shows, without unit, for example ``T20``.
    title
        Heading; the quantity by default.
    highest
        Upper end of the vertical axis, for charts that are compared. [s]
    notes
        Say under the heading what the signs mean; off where that stands elsewhere.
    width, height
        Size of the plot. [px]

    Raises
    ------
    ValueError
        No series, more than four, or two of the same look.
    """
    series = in_order(series)
    top = highest or axis_top(series, target)
    layers: list[Spec] = []
    if target is not None:
        layers += target_layers(target, bands_hz, top)
    layers += series_layers(
        series, bands_hz, f"{quantity} (s)", (0.0, top), tick_step(top), unit="s"
    )
    return finished(
        layers,
        title=title or quantity,
        subtitle=notes_on(series, target) if notes else [],
        description=" ".join(sentences(series, target, bands_hz, quantity)),
        columns=columns_of(series, target, bands_hz),
        width=width,
        height=height,
    )


def measured_against_predicted(
    predicted: Series,
    measured: Series,
    target: TargetSteps | None = None,
    *,
    bands_hz: Sequence[float] = OCTAVES,
    title: str = "Measured against predicted",
    width: float = 520,
    height: float = 260,
) -> Chart:
    """Two series and how far they are apart, told in the description and in the table."""
    chart = reverberation(
        (predicted, measured), target, bands_hz=bands_hz, title=title, width=width, height=height
    )
    gap = measured.array() - predicted.array()
    columns = {**chart.columns, "difference (s)": numbers(gap, 3)}
    words = chart.description
    if np.isfinite(gap).any():
        worst = int(np.nanargmax(np.abs(gap)))
        longer = "longer" if gap[worst] > 0 else "shorter"
        words = (
            f"The largest difference is at {bands_hz[worst]:g} Hz, where {measured.name} is "
            f"{abs(gap[worst]):.2f} s {longer} than {predicted.name}. {words}"
        )
    return Chart({**chart.spec, "description": words}, words, columns)


def formula_range(
    methods: Mapping[str, ArrayLike],
    chosen: str = "eyring",
    *,
    name: str | None = None,
    look: str = "untreated",
    assumed_hz: Sequence[float] = (),
) -> Series:
    """One formula as a line, and how far all the formulas reach as its interval."""
    every = np.array([np.asarray(values, float) for values in methods.values()])
    every = np.where(np.isfinite(every), every, np.nan)
    missing = np.isnan(every).all(axis=0)
    low = np.where(missing, np.nan, np.min(np.where(np.isnan(every), np.inf, every), axis=0))
    high = np.where(missing, np.nan, np.max(np.where(np.isnan(every), -np.inf, every), axis=0))
    return Series(
        name or chosen.replace("_", "-").title(),
        np.where(np.isfinite(methods[chosen]), methods[chosen], np.nan),
        look,
        low,
        high,
        interval="range of the formulas",
        assumed_hz=assumed_hz,
    )


def absorption(
    series: Sequence[Series],
    *,
    bands_hz: Sequence[float] = OCTAVES,
    title: str = "Absorption coefficient",
    width: float = 520,
    height: float = 220,
) -> Chart:
    """Absorption coefficients per band, with room above 1 for laboratory values."""
    series = in_order(series)
    top = max(1.2, rounded_up(largest_value(series), 0.2))
    one: Spec = {
        "data": {"values": [{"one": 1.0}]},
        "layer": [
            {
                "mark": {"type": "rule", "color": {"expr": "axis"}, "strokeWidth": 1},
                "encoding": {"y": {"field": "one", "type": "quantitative"}},
            },
            {
                "mark": {
                    "type": "text",
                    "text": "above 1 is normal for laboratory values",
                    "align": "left",
                    "baseline": "bottom",
                    "dx": 4,
                    "dy": -2,
                    "fontSize": 11,
                    "color": {"expr": "soft"},
                },
                "encoding": {"x": {"value": 0}, "y": {"field": "one", "type": "quantitative"}},
            },
        ],
    }
    layers = [one, *series_layers(series, bands_hz, "Absorption coefficient α", (0, top), 0.2)]
    said = [
        f"{one_series.name} takes most at {bands_hz[int(np.nanargmax(one_series.array()))]:g} Hz "
        f"({np.nanmax(one_series.array()):.2f})."
        for one_series in series
        if np.isfinite(one_series.array()).any()
    ]
    return finished(
        layers,
        title=title,
        subtitle=notes_on(series, None),
        description=" ".join(["Absorption coefficient per octave band.", *said]),
        columns=columns_of(series, None, bands_hz, unit="-"),
        width=width,
        height=height,
    )
