"""Charts of the low frequencies: modes, their count, a mode's pressure, the response at a seat."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from planner.bands import band_edges
from planner.report.chart import (
    MOST_ROWS,
    Chart,
    Spec,
    finished,
    number,
    numbers,
    shortened,
    thinned,
)
from planner.report.charts_bands import band_axis
from planner.report.palette import STYLES

KINDS: dict[str, tuple[str, str]] = {
    "axial": ("untreated", "triangle-up"),
    "tangential": ("option-a", "circle"),
    "oblique": ("option-b", "diamond"),
    "level": ("untreated", "triangle-up"),
    "upright": ("option-a", "circle"),
    "mixed": ("option-b", "diamond"),
    "other": ("measured", "square"),
}
"""Look and marker of each kind of mode; kinds not listed here are ``other``."""

TICKS = (10, 16, 20, 25, 31.5, 40, 50, 63, 80, 100, 125, 160, 200, 250, 315, 400, 500, 630, 800)


def modes(
    hz: ArrayLike,
    kinds: Sequence[str],
    labels: Sequence[str],
    *,
    schroeder_hz: float | None = None,
    title: str = "Room modes",
    width: float = 520,
) -> Chart:
    """Modes on a frequency line, one row per kind, told apart by row, marker and colour.

    Parameters
    ----------
    hz
        Mode frequencies, ascending, shape ``(mode,)``. [Hz]
    kinds
        ``axial``, ``tangential`` or ``oblique`` (of a box), any other word for other footprints.
    labels
        What each mode is called, for example ``1 0 0``.
    schroeder_hz
        Where the room begins to behave statistically; drawn as a line. [Hz]
    title
        Heading.
    width
        Of the plot. [px]
    """
    frequencies = np.asarray(hz, float)
    drawn = min(len(frequencies), MOST_ROWS - 40)
    lanes = [kind for kind in KINDS if any(_lane(k) == kind for k in kinds)] or ["axial"]
    rows = [
        {"hz": number(f, 2), "kind": _lane(kind), "word": kind, "label": shortened(str(label), 40)}
        for f, kind, label in zip(frequencies[:drawn], kinds, labels, strict=False)
    ]
    highest = float(frequencies[drawn - 1]) if drawn else 200.0
    lowest = float(frequencies[0]) if drawn else 20.0
    x = _hz_axis(lowest / 1.08, max(highest * 1.04, lowest * 1.5))
    y: Spec = {
        "field": "kind",
        "type": "nominal",
        "scale": {"domain": lanes},
        "axis": {"title": None, "grid": False, "domain": False, "ticks": False},
    }
    style = [STYLES[KINDS[lane][0]] for lane in lanes]
    layers: list[Spec] = [
        {
            "data": {"values": rows},
            "mark": {"type": "point", "filled": True, "size": 55, "opacity": 0.85},
            "encoding": {
                "x": {"field": "hz", **x},
                "y": y,
                "color": {
                    "field": "kind",
                    "type": "nominal",
                    "legend": None,
                    "scale": {"domain": lanes, "range": [one.colour for one in style]},
                },
                "shape": {
                    "field": "kind",
                    "type": "nominal",
                    "legend": None,
                    "scale": {"domain": lanes, "range": [KINDS[lane][1] for lane in lanes]},
                },
                "tooltip": [
                    {"field": "hz", "title": "frequency (Hz)", "type": "quantitative"},
                    {"field": "word", "title": "kind", "type": "nominal"},
                    {"field": "label", "title": "mode", "type": "nominal"},
                ],
            },
        },
        _first_labels(rows, x, y),
    ]
    notes = ["each marker is one mode; the lowest of each kind carry their numbers"]
    if drawn < len(frequencies):
        notes.insert(0, f"the lowest {drawn} of {len(frequencies)} are drawn")
    low, high = x["scale"]["domain"]
    if schroeder_hz is not None and low < schroeder_hz < high:
        layers.append(_schroeder(schroeder_hz, x))
        notes.append(f"dashed line: Schroeder frequency, {schroeder_hz:.0f} Hz")
    return finished(
        layers,
        title=title,
        subtitle=["; ".join(notes)],
        description=_mode_sentence(rows, len(frequencies), schroeder_hz),
        columns={
            "mode": [str(label) for label in labels],
            "frequency (Hz)": numbers(frequencies, 2),
            "kind": list(kinds),
        },
        width=width,
        height=46 * len(lanes) + 20,
    )


def mode_count(
    bands_hz: Sequence[float],
    counts: ArrayLike,
    *,
    title: str = "Modes per one-third octave",
    width: float = 520,
    height: float = 170,
) -> Chart:
    """Number of modes in each one-third-octave band; too few, and a falling count, stick out."""
    count = np.asarray(counts, int)
    low, high = band_edges(list(bands_hz), fraction=3)
    rows = [
        {"from": number(a), "to": number(b), "band": hz, "count": int(n)}
        for a, b, hz, n in zip(low, high, bands_hz, count, strict=True)
    ]
    x = {"field": "from", **band_axis(bands_hz), "type": "quantitative"}
    x["axis"] = {**x["axis"], "values": list(bands_hz)}
    top = int(count.max(initial=1))
    y = {
        "field": "count",
        "type": "quantitative",
        "scale": {"domain": [0, top * 1.15], "nice": False},
        "axis": {"title": "Number of modes", "tickMinStep": 1, "tickCount": 5, "format": "d"},
    }
    bars: Spec = {
        "mark": {
            "type": "rect",
            "color": STYLES["untreated"].colour,
            "opacity": 0.75,
            "stroke": {"expr": "page"},
        },
        "encoding": {"x": x, "x2": {"field": "to"}, "y": y, "y2": {"datum": 0}},
    }
    text: Spec = {
        "mark": {"type": "text", "dy": -7, "color": {"expr": "ink"}},
        "encoding": {"x": {**x, "field": "band"}, "y": y, "text": {"field": "count"}},
    }
    falls = [
        f"{hz:g} Hz"
        for hz, before, n in zip(bands_hz[1:], count, count[1:], strict=False)
        if n < before
    ]
    words = "The number of modes per one-third octave never falls as frequency rises."
    if falls:
        words = f"The number of modes falls back at {', '.join(falls)}: these bands are uneven."
    return finished(
        [{"data": {"values": rows}, "layer": [bars, text]}],
        title=title,
        description=words,
        columns={"band (Hz)": list(bands_hz), "modes": count.tolist()},
        width=width,
        height=height,
    )


def response(
    hz: ArrayLike,
    curves: Sequence[tuple[str, ArrayLike]],
    *,
    title: str = "Response at the seat",
    reference: str = "re the mean of the curve",
    width: float = 520,
    height: float = 240,
) -> Chart:
    """Level against frequency at the seat, up to four curves.

    Parameters
    ----------
    hz
        Frequencies, shape ``(point,)``. [Hz]
    curves
        Name and level of each curve, shape ``(point,)``. [dB]
    title
        Heading.
    reference
        What 0 dB is, in words.
    width, height
        Size of the plot. [px]
    """
    frequency = np.asarray(hz, float)
    curves = list(curves)[: len(STYLES)]
    keep = thinned(len(frequency), (MOST_ROWS - 20) // max(len(curves), 1))
    levels = [np.asarray(level, float) for _, level in curves]
    names = [shortened(name, 60) for name, _ in curves]
    rows = [
        {"hz": number(f, 3), "level": number(level[i], 2), "series": name}
        for name, level in zip(names, levels, strict=True)
        for i, f in zip(keep, frequency[keep], strict=True)
    ]
    looks = list(STYLES.values())[: len(names)]
    colour = {
        "field": "series",
        "type": "nominal",
        "scale": {"domain": names, "range": [style.colour for style in looks]},
        "legend": {"title": None, "symbolType": "stroke"},
    }
    dash = {**colour, "scale": {"domain": names, "range": [list(s.dash) or [1, 0] for s in looks]}}
    every = np.concatenate(levels)[np.isfinite(np.concatenate(levels))] if levels else np.zeros(1)
    low, high = 5 * np.floor(every.min() / 5), 5 * np.ceil(every.max() / 5)
    line: Spec = {
        "data": {"values": rows},
        "mark": {"type": "line", "strokeWidth": 2, "clip": True},
        "encoding": {
            "x": {"field": "hz", **_hz_axis(float(frequency[0]), float(frequency[-1]))},
            "y": {
                "field": "level",
                "type": "quantitative",
                "scale": {"domain": [float(max(low, high - 60)), float(high)], "nice": False},
                "axis": {
                    "title": "Level (dB)",
                    "tickCount": 6,
                    "labelExpr": "replace(datum.label, '-', '−')",
                },
            },
            "color": colour,
            "strokeDash": dash,
        },
    }
    return finished(
        [line],
        title=title,
        subtitle=[f"0 dB: {reference}"],
        description=" ".join(
            _response_sentence(name, frequency, level)
            for name, level in zip(names, levels, strict=True)
        ),
        columns={
            "frequency (Hz)": numbers(frequency, 3),
            **{
                f"{name} (dB)": numbers(level, 2) for name, level in zip(names, levels, strict=True)
            },
        },
        width=width,
        height=height,
    )


def mode_pressure(
    x: ArrayLike,
    y: ArrayLike,
    pressure: ArrayLike,
    *,
    outline: ArrayLike,
    seat: Sequence[float] | None = None,
    loudspeakers: Sequence[Sequence[float]] = (),
    title: str = "Pressure of the mode",
    width: float = 360,
) -> Chart:
    """Plan of the room with the strength of one mode's pressure, front wall on the left.

    Parameters
    ----------
    x, y
        Midpoints of the grid's columns and rows. [m]
    pressure
        Pressure relative to its largest value, shape ``(row, column)``; NaN outside the room. [-]
    outline
        Corners of the footprint, shape ``(corner, 2)``. [m]
    seat, loudspeakers
        Their places; x and y are drawn. [m]
    title
        Heading.
    width
        Of the plot; its height follows the room. [px]
    """
    columns, lines = np.asarray(x, float), np.asarray(y, float)
    field = np.abs(np.asarray(pressure, float))
    corners = np.asarray(outline, float)
    low, size = corners.min(axis=0), np.ptp(corners, axis=0)
    edges_x, edges_y = _cells(low, size)
    picked_x = _nearest(columns, (edges_x[1:] + edges_x[:-1]) / 2)
    picked_y = _nearest(lines, (edges_y[1:] + edges_y[:-1]) / 2)
    rows = [
        {
            "x": number(edges_x[i]), "x2": number(edges_x[i + 1]),
            "y": number(edges_y[j]), "y2": number(edges_y[j + 1]),
            "p": number(field[b, a], 3),
        }
        for j, b in enumerate(picked_y)
        for i, a in enumerate(picked_x)
        if np.isfinite(field[b, a])
    ]  # fmt: skip
    across: Spec = {
        "field": "x",
        "type": "quantitative",
        "scale": {"domain": [float(low[0]), float(low[0] + size[0])], "nice": False},
        "axis": {"title": "x from the front wall (m)", "grid": False},
    }
    along: Spec = {
        "field": "y",
        "type": "quantitative",
        "scale": {"domain": [float(low[1]), float(low[1] + size[1])], "nice": False},
        "axis": {"title": "y (m)", "grid": False},
    }
    shade = {
        "field": "p",
        "type": "quantitative",
        "scale": {
            "domain": [0, 1],
            "range": ["#f3f2f8", "#5559a4", "#26285c"],
            "interpolate": "lab",
        },
        "legend": {"title": "|p| / largest", "gradientLength": 110, "values": [0, 0.5, 1]},
    }
    ring = [*corners.tolist(), corners[0].tolist()]
    layers: list[Spec] = [
        {
            "data": {"values": rows},
            "mark": {"type": "rect"},
            "encoding": {
                "x": across, "x2": {"field": "x2"}, "y": along, "y2": {"field": "y2"},
                "color": shade,
            },
        },
        {
            "data": {"values": [{"n": n, "x": a, "y": b} for n, (a, b) in enumerate(ring)]},
            "mark": {"type": "line", "color": {"expr": "ink"}, "strokeWidth": 1.5},
            "encoding": {"x": across, "y": along, "order": {"field": "n", "type": "quantitative"}},
        },
        *_places(seat, loudspeakers, across, along),
    ]  # fmt: skip
    words = f"{title}: pressure is largest where the plan is darkest."
    if seat is not None:
        i, j = np.abs(columns - seat[0]).argmin(), np.abs(lines - seat[1]).argmin()
        if np.isfinite(field[j, i]):
            words += f" At the seat it is {100 * field[j, i]:.0f} % of the largest."
    grid_x, grid_y = np.meshgrid(columns, lines)
    return finished(
        layers,
        title=title,
        description=words,
        columns={
            "x (m)": numbers(grid_x, 3),
            "y (m)": numbers(grid_y, 3),
            "pressure relative to the largest": numbers(field, 3),
        },
        width=width,
        height=round(width * float(size[1] / size[0])),
    )


def _lane(kind: str) -> str:
    return kind if kind in KINDS else "other"


def _hz_axis(low: float, high: float) -> Spec:
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


def _first_labels(rows: list[Spec], x: Spec, y: Spec) -> Spec:
    """Labels of the lowest modes of each kind, where they do not run into each other."""
    chosen, last = [], dict[str, float]()
    for row in rows:
        frequency = float(row["hz"])
        if frequency / last.get(row["kind"], 1.0) > 1.22:
            last[row["kind"]] = frequency
            chosen.append(row)
    return {
        "data": {"values": chosen[:30]},
        "mark": {"type": "text", "dy": -13, "fontSize": 11, "color": {"expr": "soft"}},
        "encoding": {"x": {"field": "hz", **x}, "y": y, "text": {"field": "label"}},
    }


def _schroeder(hz: float, x: Spec) -> Spec:
    return {
        "data": {"values": [{"hz": round(hz, 1)}]},
        "mark": {"type": "rule", "color": {"expr": "soft"}, "strokeDash": [4, 3]},
        "encoding": {"x": {"field": "hz", **x}},
    }


def _mode_sentence(rows: list[Spec], total: int, schroeder_hz: float | None) -> str:
    if not rows:
        return "No mode lies in this range."
    frequencies = np.array([row["hz"] for row in rows], float)
    text = f"{total} modes; the lowest is {rows[0]['word']} at {frequencies[0]:.1f} Hz"
    if len(frequencies) > 2:
        widest = int(np.argmax(np.diff(np.log2(frequencies))))
        text += f"; the widest gap is from {frequencies[widest]:.1f} to {frequencies[widest + 1]:.1f} Hz"
    if schroeder_hz is not None and np.isfinite(schroeder_hz):
        text += f"; single modes stick out below about {schroeder_hz:.0f} Hz"
    return f"{text}."


def _response_sentence(name: str, hz: np.ndarray[Any, Any], level: np.ndarray[Any, Any]) -> str:
    if not np.isfinite(level).any():
        return f"{name} has no values."
    top, dip = int(np.nanargmax(level)), int(np.nanargmin(level))
    return (
        f"{name} is strongest at {hz[top]:.0f} Hz ({level[top]:+.0f} dB) and weakest at "
        f"{hz[dip]:.0f} Hz ({level[dip]:+.0f} dB)."
    ).replace("-", "−")


def _cells(
    low: np.ndarray[Any, Any], size: np.ndarray[Any, Any]
) -> tuple[np.ndarray[Any, Any], np.ndarray[Any, Any]]:
    """Edges of nearly square cells over the bounding box, as many as a chart may hold."""
    across = max(2, int((0.9 * MOST_ROWS * size[0] / size[1]) ** 0.5))
    along = max(2, int(0.9 * MOST_ROWS / across))
    return (
        np.linspace(low[0], low[0] + size[0], across + 1),
        np.linspace(low[1], low[1] + size[1], along + 1),
    )


def _nearest(points: np.ndarray[Any, Any], wanted: np.ndarray[Any, Any]) -> Any:
    """Index of the point nearest to each wanted place."""
    return np.abs(points[None, :] - wanted[:, None]).argmin(axis=1)


def _places(
    seat: Sequence[float] | None, loudspeakers: Sequence[Sequence[float]], x: Spec, y: Spec
) -> list[Spec]:
    rows = [{"x": s[0], "y": s[1], "what": "loudspeaker"} for s in loudspeakers]
    if seat is not None:
        rows.append({"x": seat[0], "y": seat[1], "what": "seat"})
    if not rows:
        return []
    encoding: Spec = {"x": x, "y": y}
    return [
        {
            "data": {"values": rows},
            "layer": [
                {
                    "mark": {
                        "type": "point", "filled": True, "size": 90, "color": "#ffffff",
                        "stroke": "#1d1f24", "strokeWidth": 1.5, "opacity": 1,
                    },
                    "encoding": {
                        **encoding,
                        "shape": {
                            "field": "what",
                            "type": "nominal",
                            "scale": {"domain": ["loudspeaker", "seat"], "range": ["square", "circle"]},
                            "legend": {"title": None},
                        },
                    },
                },
            ],
        }
    ]  # fmt: skip
