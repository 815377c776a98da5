"""Charts of the bass where one sits: the response at the seat, the pressure of a mode in plan."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

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
from planner.report.frequency_axis import hz_axis
from planner.report.palette import STYLES


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
            "x": {"field": "hz", **hz_axis(float(frequency[0]), float(frequency[-1]))},
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
