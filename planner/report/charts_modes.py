"""Charts of room modes: where they lie, and how many in each third octave."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from planner.bands import band_edges
from planner.report.band_layers import band_axis
from planner.report.chart import (
    MOST_ROWS,
    Chart,
    Spec,
    finished,
    number,
    numbers,
    shortened,
)
from planner.report.frequency_axis import hz_axis
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
    x = hz_axis(lowest / 1.08, max(highest * 1.04, lowest * 1.5))
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


def _lane(kind: str) -> str:
    return kind if kind in KINDS else "other"


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
