"""Charts over frequency bands: reverberation times, absorption coefficients, mode counts."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.bands import OCTAVES, band_label
from planner.report.chart import Chart, Spec, finished, joined, number, numbers, shortened
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
    series = _distinct(series)
    top = highest or axis_top(series, target)
    layers: list[Spec] = []
    if target is not None:
        layers += _target_layers(target, bands_hz, top)
    layers += _series_layers(series, bands_hz, f"{quantity} (s)", (0.0, top), _step(top), unit="s")
    return finished(
        layers,
        title=title or quantity,
        subtitle=_notes(series, target) if notes else [],
        description=" ".join(_sentences(series, target, bands_hz, quantity)),
        columns=_columns(series, target, bands_hz),
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
    series = _distinct(series)
    top = max(1.2, _ceiling(_largest(series), 0.2))
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
    layers = [one, *_series_layers(series, bands_hz, "Absorption coefficient α", (0, top), 0.2)]
    sentences = [
        f"{one_series.name} takes most at {bands_hz[int(np.nanargmax(one_series.array()))]:g} Hz "
        f"({np.nanmax(one_series.array()):.2f})."
        for one_series in series
        if np.isfinite(one_series.array()).any()
    ]
    return finished(
        layers,
        title=title,
        subtitle=_notes(series, None),
        description=" ".join(["Absorption coefficient per octave band.", *sentences]),
        columns=_columns(series, None, bands_hz, unit="-"),
        width=width,
        height=height,
    )


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
    largest = _largest(series)
    if target is not None:
        limits = np.concatenate([np.asarray(target.high, float), np.asarray(target.low, float)])
        finite = limits[np.isfinite(limits)]
        largest = max([largest, *(1.1 * finite)])
    return _ceiling(largest * 1.02, _step(largest))


def _distinct(series: Sequence[Series]) -> list[Series]:
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


def _largest(series: Sequence[Series]) -> float:
    values = [one.array() for one in series]
    values += [np.asarray(one.high, float) for one in series if one.high is not None]
    every = np.concatenate(values)
    finite = every[np.isfinite(every)]
    return float(finite.max()) if finite.size else 1.0


def _ceiling(value: float, step: float) -> float:
    return round(max(float(np.ceil(value / step - 1e-9)), 1.0) * step, 6)


def _step(top: float) -> float:
    """Distance of the ticks: 0.2 s, wider for long reverberation. [s]."""
    if top <= 0.5:
        return 0.1
    return next((step for step in (0.2, 0.5, 1.0, 2.0, 5.0) if top / step <= 8.01), 10.0)


def _target_layers(target: TargetSteps, bands_hz: Sequence[float], top: float) -> list[Spec]:
    low, high = _limits(target)
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


def _series_layers(
    series: Sequence[Series],
    bands_hz: Sequence[float],
    title: str,
    domain: tuple[float, float],
    step: float,
    unit: str = "",
) -> list[Spec]:
    rows = [row for n, one in enumerate(series) for row in _rows(one, n, bands_hz)]
    names = [one.name for one in series]
    styles = [STYLES[one.look] for one in series]
    colour = {
        "field": "series",
        "type": "nominal",
        "scale": {"domain": names, "range": [style.colour for style in styles]},
        "legend": {"title": None, "symbolStrokeWidth": 0, "symbolOpacity": 1},
    }
    shape = {
        **colour,
        "scale": {"domain": names, "range": [style.marker for style in styles]},
    }
    dash = {
        **colour,
        "scale": {"domain": names, "range": [list(style.dash) or [1, 0] for style in styles]},
    }
    ticks = np.round(np.arange(domain[0], domain[1] + step / 2, step), 6).tolist()
    y = {
        "field": "value",
        "type": "quantitative",
        "scale": {"domain": list(domain), "nice": False},
        "axis": {
            "title": title,
            "values": ticks,
            "tickCount": len(ticks),
            "format": ".1f",
            "labelOverlap": False,
        },
    }
    x = {"field": "band", **band_axis(bands_hz)}
    tooltip = [
        {"field": "series", "title": "series", "type": "nominal"},
        {"field": "band", "title": "band (Hz)", "type": "quantitative"},
        {"field": "value", "title": f"value ({unit})" if unit else "value", "format": ".2f"},
        {"field": "basis", "title": "basis", "type": "nominal"},
    ]
    interval: Spec = {
        "transform": [{"filter": "isValid(datum.low) && isValid(datum.high)"}],
        "mark": {"type": "rule", "clip": True},
        "encoding": {
            "x": x,
            "y": {**y, "field": "low"},
            "y2": {"field": "high"},
            "color": colour,
            "strokeWidth": {"field": "bar", "type": "quantitative", "scale": None},
            "opacity": {"condition": {"test": "datum.bar > 2", "value": 0.28}, "value": 1},
        },
    }
    line: Spec = {
        "mark": {"type": "line", "strokeWidth": 2, "clip": True},
        "encoding": {"x": x, "y": y, "color": colour, "strokeDash": dash},
    }
    points: Spec = {
        "transform": [{"filter": "isValid(datum.value)"}],
        "mark": {"type": "point", "size": 75, "filled": True, "opacity": 1, "strokeWidth": 2},
        "encoding": {"x": x, "y": y, "color": colour, "shape": shape, "tooltip": tooltip},
    }
    hollow: Spec = {
        "transform": [{"filter": "isValid(datum.value) && datum.assumed"}],
        "mark": {
            "type": "point",
            "size": 26,
            "filled": True,
            "opacity": 1,
            "color": {"expr": "page"},
        },
        "encoding": {"x": x, "y": y, "shape": shape},
    }
    missing: Spec = {
        "transform": [{"filter": "!isValid(datum.value)"}],
        "layer": [
            {
                "mark": {"type": "point", "size": 60, "filled": False, "strokeWidth": 1.5},
                "encoding": {
                    "x": x,
                    "y": {"datum": domain[0]},
                    "color": colour,
                    "shape": shape,
                },
            },
            {
                "mark": {
                    "type": "text",
                    "text": "no value",
                    "angle": 270,
                    "align": "left",
                    "dx": 9,
                    "fontSize": 11,
                    "color": {"expr": "soft"},
                },
                "encoding": {"x": x, "y": {"datum": domain[0]}},
            },
        ],
    }
    inner = [interval, line, points, hollow]
    if any(row["value"] is None for row in rows):
        inner.append(missing)
    return [{"data": {"values": rows}, "layer": inner}]


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


def _notes(series: Sequence[Series], target: TargetSteps | None) -> list[str]:
    """What the signs mean, in words under the heading."""
    notes = []
    if target is not None:
        notes.append(f"grey steps: target – {shortened(target.name, 90)}")
    predicted = dict.fromkeys(
        one.interval for one in series if one.low is not None and one.look != "measured"
    )
    notes += [f"pale bar: {words}" for words in predicted]
    notes += [
        f"thin line: {one.interval}"
        for one in series
        if one.low is not None and one.look == "measured"
    ]
    if any(one.assumed_hz for one in series):
        notes.append("hollow marker: assumed")
    return ["; ".join(notes)] if notes else []


def _sentences(
    series: Sequence[Series], target: TargetSteps | None, bands_hz: Sequence[float], quantity: str
) -> list[str]:
    if target is None:
        return [_plain_sentence(one, bands_hz, quantity) for one in series]
    return [target_sentence(one, target, bands_hz) for one in series]


def _plain_sentence(one: Series, bands_hz: Sequence[float], quantity: str) -> str:
    values = one.array()
    known = np.flatnonzero(np.isfinite(values))
    if not known.size:
        return f"{one.name} has no value in any band."
    first, last = known[np.argmin(values[known])], known[np.argmax(values[known])]
    return (
        f"{quantity} of {one.name} is from {values[first]:.2f} s at {bands_hz[first]:g} Hz to "
        f"{values[last]:.2f} s at {bands_hz[last]:g} Hz."
    )


def target_sentence(one: Series, target: TargetSteps, bands_hz: Sequence[float] = OCTAVES) -> str:
    """Where a series is inside the target and by how much it misses elsewhere, as a sentence."""
    inside, unknown = [], []
    missed: dict[str, list[tuple[float, str]]] = {"long": [], "short": []}
    limits = zip(bands_hz, one.array(), *_limits(target), strict=True)
    for hz, value, lower, upper in limits:
        label = f"{hz:g} Hz"
        if not (np.isfinite(lower) or np.isfinite(upper)):
            continue
        if not np.isfinite(value):
            unknown.append(label)
        elif value > upper:
            missed["long"].append((value - upper, label))
        elif value < lower:
            missed["short"].append((lower - value, label))
        else:
            inside.append(label)
    outside = [_missed(direction, entries) for direction, entries in missed.items() if entries]
    if not (inside or outside or unknown):
        return f"{one.name}: the target says nothing about these bands."
    if not (inside or outside):
        text = f"{one.name} has no value where the target has limits"
    elif not outside:
        text = f"{one.name} is inside the target in every band that has a value"
    elif inside:
        text = f"{one.name} is inside the target at {joined(inside)}; it is {joined(outside)}"
    else:
        text = f"{one.name} is outside the target: {joined(outside)}"
    if unknown and (inside or outside):
        text += f"; no value at {joined(unknown)}"
    assumed = [f"{hz:g} Hz" for hz in one.assumed_hz]
    return f"{text}{f' (assumed at {joined(assumed)})' if assumed else ''}."


def _limits(target: TargetSteps) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    return np.asarray(target.low, float), np.asarray(target.high, float)


def _missed(direction: str, entries: list[tuple[float, str]]) -> str:
    """``0.10 s too long at 63 Hz``, or the range of many bands in one phrase."""
    if len(entries) <= 3:
        return joined([f"{max(by, 0.005):.2f} s too {direction} at {hz}" for by, hz in entries])
    most, where = max(entries)
    bands = joined([hz for _, hz in entries])
    return f"too {direction} at {bands}, most at {where} (by {most:.2f} s)"


def _columns(
    series: Sequence[Series],
    target: TargetSteps | None,
    bands_hz: Sequence[float],
    unit: str = "s",
) -> dict[str, Sequence[Any]]:
    columns: dict[str, Sequence[Any]] = {"band (Hz)": list(bands_hz)}
    for one in series:
        columns[f"{one.name} ({unit})"] = numbers(one.values, 3)
        if one.low is not None and one.high is not None:
            columns[f"{one.name}, {one.interval}, from ({unit})"] = numbers(one.low, 3)
            columns[f"{one.name}, {one.interval}, to ({unit})"] = numbers(one.high, 3)
        if one.assumed_hz:
            columns[f"{one.name}, basis"] = [
                "assumed" if hz in one.assumed_hz else "" for hz in bands_hz
            ]
    if target is not None:
        columns["target from (s)"] = numbers(target.low, 3)
        columns["target to (s)"] = numbers(target.high, 3)
    return columns
