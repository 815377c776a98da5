"""The parts of a chart over bands: its axes, the target's steps, lines, markers and intervals."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from planner.bands import band_label
from planner.report.band_series import Series, TargetSteps, limits_of
from planner.report.chart import Spec, number, numbers
from planner.report.palette import STYLES


def band_axis(bands_hz: Sequence[float], title: str | None = None) -> Spec:
    """The frequency axis: base-two logarithm, a tick at each nominal midband, no grid."""
    bands = [float(hz) for hz in bands_hz]
    thirds = len(bands) > 2 and bands[1] / bands[0] < 1.5
    reach = 2.0 ** (1 / 6) if thirds else 2.0**0.5
    labels = {hz: band_label(hz) for hz in bands}
    expression = "".join(f"datum.value=={hz:g}?'{text}':" for hz, text in labels.items()) + "''"
    name = "One-third-octave" if thirds else "Octave"
    return {
        "type": "quantitative",
        "scale": {
            "type": "log",
            "base": 2,
            "domain": [bands[0] / reach, bands[-1] * reach],
            "nice": False,
        },
        "axis": {
            "values": [hz for n, hz in enumerate(bands) if not thirds or n % 3 == 1],
            "labelExpr": expression,
            "grid": False,
            "labelOverlap": False,
            "labelAngle": 0,
            "title": title or f"{name}-band centre frequency (Hz)",
        },
    }


def axis_top(series: Sequence[Series], target: TargetSteps | None = None) -> float:
    """Upper end of the vertical axis that holds all the series and the target. [s]."""
    largest = largest_value(series)
    if target is not None:
        limits = np.concatenate([np.asarray(target.high, float), np.asarray(target.low, float)])
        finite = limits[np.isfinite(limits)]
        largest = max([largest, *(1.1 * finite)])
    return rounded_up(largest * 1.02, tick_step(largest))


def largest_value(series: Sequence[Series]) -> float:
    """Largest value of all series and their intervals, 1 where there is none."""
    values = [one.array() for one in series]
    values += [np.asarray(one.high, float) for one in series if one.high is not None]
    every = np.concatenate(values)
    finite = every[np.isfinite(every)]
    return float(finite.max()) if finite.size else 1.0


def rounded_up(value: float, step: float) -> float:
    """The next whole multiple of `step`, at least one."""
    return round(max(float(np.ceil(value / step - 1e-9)), 1.0) * step, 6)


def tick_step(top: float) -> float:
    """Distance of the ticks: 0.2 s, wider for long reverberation. [s]."""
    if top <= 0.5:
        return 0.1
    return next((step for step in (0.2, 0.5, 1.0, 2.0, 5.0) if top / step <= 8.01), 10.0)


def target_layers(target: TargetSteps, bands_hz: Sequence[float], top: float) -> list[Spec]:
    """One grey step per band, from f/√2 to f·√2, with its limits as thin lines."""
    low, high = limits_of(target)
    rows = []
    for hz, lower, upper in zip(bands_hz, low, high, strict=True):
        if np.isfinite(lower) or np.isfinite(upper):
            rows.append(
                {
                    "from": round(hz / 2**0.5, 3),
                    "to": round(hz * 2**0.5, 3),
                    "bottom": number(lower) or 0.0,
                    "top": number(upper) if np.isfinite(upper) else top,
                    "low": number(lower),
                    "high": number(upper),
                }
            )
    x = {"x": {"field": "from", "type": "quantitative"}, "x2": {"field": "to"}}
    zone: Spec = {
        "mark": {"type": "rect", "color": {"expr": "zone"}, "opacity": 0.22, "clip": True},
        "encoding": {**x, "y": {"field": "bottom", "type": "quantitative"}, "y2": {"field": "top"}},
    }
    edges: list[Spec] = [
        {
            "mark": {"type": "rule", "color": {"expr": "zone_edge"}, "strokeWidth": 1},
            "transform": [{"filter": f"isValid(datum.{field})"}],
            "encoding": {**x, "y": {"field": field, "type": "quantitative"}},
        }
        for field in ("low", "high")
    ]
    return [{"data": {"values": rows}, "layer": [zone, *edges]}] if rows else []


def series_layers(
    series: Sequence[Series],
    bands_hz: Sequence[float],
    title: str,
    domain: tuple[float, float],
    step: float,
    unit: str = "",
) -> list[Spec]:
    """Intervals, lines, markers (hollow where assumed) and signs for missing values."""
    rows = [row for n, one in enumerate(series) for row in _rows(one, n, bands_hz)]
    place = {
        "x": {"field": "band", **band_axis(bands_hz)},
        "y": _value_axis(title, domain, step),
    }
    colour, shape, dash = _looks(series)
    layers = [
        _intervals(place, colour),
        {
            "mark": {"type": "line", "strokeWidth": 2, "clip": True},
            "encoding": {**place, "color": colour, "strokeDash": dash},
        },
        _markers(place, colour, shape, unit),
        _hollows(place, shape),
    ]
    if any(row["value"] is None for row in rows):
        layers.append(_missing(place["x"], domain[0], colour, shape))
    return [{"data": {"values": rows}, "layer": layers}]


def _value_axis(title: str, domain: tuple[float, float], step: float) -> Spec:
    ticks = np.round(np.arange(domain[0], domain[1] + step / 2, step), 6).tolist()
    return {
        "field": "value",
        "type": "quantitative",
        "scale": {"domain": list(domain), "nice": False},
        "axis": {
            "title": title,
            "values": ticks,
            # Without it Vega drops every other one of the ticks asked for.
            "tickCount": len(ticks),
            "format": ".1f",
            "labelOverlap": False,
        },
    }


def _looks(series: Sequence[Series]) -> tuple[Spec, Spec, Spec]:
    """Encodings of colour, marker and dash, with one legend for all three."""
    names = [one.name for one in series]
    styles = [STYLES[one.look] for one in series]
    ranges = (
        [style.colour for style in styles],
        [style.marker for style in styles],
        [list(style.dash) or [1, 0] for style in styles],
    )
    legend = {"title": None, "symbolStrokeWidth": 0, "symbolOpacity": 1}
    colour, shape, dash = (
        {
            "field": "series",
            "type": "nominal",
            "scale": {"domain": names, "range": values},
            "legend": legend,
        }
        for values in ranges
    )
    return colour, shape, dash


def _intervals(place: Spec, colour: Spec) -> Spec:
    """Pale bars for predictions, thin lines for measurements."""
    return {
        "transform": [{"filter": "isValid(datum.low) && isValid(datum.high)"}],
        "mark": {"type": "rule", "clip": True},
        "encoding": {
            "x": place["x"],
            "y": {**place["y"], "field": "low"},
            "y2": {"field": "high"},
            "color": colour,
            "strokeWidth": {"field": "bar", "type": "quantitative", "scale": None},
            "opacity": {"condition": {"test": "datum.bar > 2", "value": 0.28}, "value": 1},
        },
    }


def _markers(place: Spec, colour: Spec, shape: Spec, unit: str) -> Spec:
    value = f"value ({unit})" if unit else "value"
    tooltip = [
        {"field": "series", "title": "series", "type": "nominal"},
        {"field": "band", "title": "band (Hz)", "type": "quantitative"},
        {"field": "value", "title": value, "format": ".2f"},
        {"field": "basis", "title": "basis", "type": "nominal"},
    ]
    return {
        "transform": [{"filter": "isValid(datum.value)"}],
        "mark": {"type": "point", "size": 75, "filled": True, "opacity": 1, "strokeWidth": 2},
        "encoding": {**place, "color": colour, "shape": shape, "tooltip": tooltip},
    }


def _hollows(place: Spec, shape: Spec) -> Spec:
    """The page's colour inside the markers of assumed bands."""
    page = {"expr": "page"}
    return {
        "transform": [{"filter": "isValid(datum.value) && datum.assumed"}],
        "mark": {"type": "point", "size": 26, "filled": True, "opacity": 1, "color": page},
        "encoding": {**place, "shape": shape},
    }


def _missing(x: Spec, bottom: float, colour: Spec, shape: Spec) -> Spec:
    """A hollow marker on the axis and the words ``no value`` where a series has none."""
    words = {
        "type": "text", "text": "no value", "angle": 270, "align": "left", "dx": 9,
        "fontSize": 11, "color": {"expr": "soft"},
    }  # fmt: skip
    return {
        "transform": [{"filter": "!isValid(datum.value)"}],
        "layer": [
            {
                "mark": {"type": "point", "size": 60, "filled": False, "strokeWidth": 1.5},
                "encoding": {"x": x, "y": {"datum": bottom}, "color": colour, "shape": shape},
            },
            {"mark": words, "encoding": {"x": x, "y": {"datum": bottom}}},
        ],
    }


def _rows(one: Series, number_in_chart: int, bands_hz: Sequence[float]) -> list[Spec]:
    values = numbers(one.values)
    empty = [None] * len(values)
    low = numbers(one.low) if one.low is not None else empty
    high = numbers(one.high) if one.high is not None else empty
    width = 1.5 if one.look == "measured" else 15 - 4 * number_in_chart
    rows = []
    for hz, value, lower, upper in zip(bands_hz, values, low, high, strict=True):
        assumed = hz in one.assumed_hz
        rows.append(
            {
                "series": one.name,
                "band": hz,
                "value": value,
                "low": lower,
                "high": upper,
                "assumed": assumed,
                "bar": width,
                "basis": "assumed" if assumed else "",
            }
        )
    return rows
