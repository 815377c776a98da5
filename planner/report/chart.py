"""What a chart is here: a ready Vega-Lite dictionary, its message in words, and its numbers.

The dictionaries are written directly (building the same chart through Altair objects takes longer
than a whole redraw of the app's page); `Chart.altair` turns one into an Altair chart, checked
against its schema. Light and dark pages differ in four named colours and in the configuration.
"""

from __future__ import annotations

import functools
import hashlib
import json
import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from html import escape
from typing import TYPE_CHECKING, Any

import numpy as np

from planner.report.glyphs import printable
from planner.report.palette import DARK, FONT, FONT_STACK, FONTS, LIGHT, Theme

if TYPE_CHECKING:
    import altair
    import pandas

SCHEMA = "https://vega.github.io/schema/vega-lite/v6.json"
"""Names the dialect; nothing is fetched from there."""
VEGALITE = "6.4"
MOST_ROWS = 400
"""Rows that one chart may hold; longer curves are thinned, longer lists are cut with a note."""

Spec = dict[str, Any]


@dataclass(frozen=True, slots=True)
class Chart:
    """A chart, the sentence that says what it shows, and the same numbers as a table."""

    spec: Spec
    """Vega-Lite without configuration."""
    description: str
    """One or two sentences with the message; the accessible name on screen and on paper."""
    columns: Mapping[str, Sequence[Any]] = field(default_factory=dict)
    """The numbers, by column heading with unit."""

    @property
    def title(self) -> str:
        """The heading drawn above the chart."""
        title = self.spec.get("title", "")
        return str(title.get("text", "")) if isinstance(title, dict) else str(title)

    def table(self) -> pandas.DataFrame:
        """The numbers as a table, one column per heading."""
        import pandas

        return pandas.DataFrame({name: list(values) for name, values in self.columns.items()})

    def vega_lite(self, theme: Theme = LIGHT) -> Spec:
        """The complete Vega-Lite dictionary for a page of that theme."""
        return {**self.spec, "config": config(theme), "params": theme_params(theme)}

    def altair(self, theme: Theme = LIGHT) -> altair.Chart:
        """The same as an Altair chart, checked against its schema."""
        import altair

        chart: altair.Chart = altair.Chart.from_dict(self.vega_lite(theme))
        return chart

    def sized(self, width: float | str, height: float) -> Chart:
        """The same chart with another plot size in pixels; ``"container"`` fills the page."""
        return replace(self, spec={**self.spec, "width": width, "height": height})


def theme_params(theme: Theme) -> list[Spec]:
    """The colours that marks refer to by name."""
    names = ("page", "ink", "soft", "axis", "zone", "zone_edge")
    return [{"name": name, "value": getattr(theme, name)} for name in names]


def config(theme: Theme = LIGHT) -> Spec:
    """Vega-Lite configuration shared by screen and paper."""
    axis = {
        "labelColor": theme.ink,
        "titleColor": theme.ink,
        "gridColor": theme.grid,
        "domainColor": theme.axis,
        "tickColor": theme.axis,
        "labelFontSize": 12,
        "titleFontSize": 12,
        "titleFontWeight": "normal",
        "titlePadding": 8,
    }
    return {
        "background": theme.page,
        "font": FONT_STACK,
        "view": {"stroke": None},
        "axis": axis,
        "title": {
            "anchor": "start",
            "color": theme.ink,
            "subtitleColor": theme.soft,
            "fontSize": 14,
            "subtitleFontSize": 12,
            "subtitlePadding": 5,
            "offset": 10,
        },
        "legend": {
            "orient": "top",
            "direction": "horizontal",
            "labelColor": theme.ink,
            "titleColor": theme.ink,
            "labelFontSize": 12,
            "symbolSize": 90,
            "labelLimit": 190,
            "columnPadding": 16,
            "offset": 6,
        },
        "text": {"fontSize": 12, "font": FONT_STACK},
    }


def finished(
    layers: Sequence[Spec],
    *,
    title: str,
    subtitle: Sequence[str] = (),
    description: str,
    columns: Mapping[str, Sequence[Any]],
    width: float = 520,
    height: float = 260,
    **more: Any,
) -> Chart:
    """Layers put together under a heading, with the words and numbers that go with them."""
    heading: Spec = {"text": shortened(title, 90)}
    if subtitle:
        heading["subtitle"] = [
            line for text in subtitle for line in wrapped(text, int(width / 6.2))
        ]
    spec: Spec = {
        "$schema": SCHEMA,
        "title": heading,
        "description": description,
        "width": width,
        "height": height,
        "autosize": {"type": "pad", "contains": "padding"},
        "layer": list(layers),
        **more,
    }
    return Chart(spec, description, columns)


def to_svg(chart: Chart, theme: Theme = LIGHT) -> str:
    """The chart as SVG text with its description as accessible name; no browser is needed.

    Raises
    ------
    MissingPartError
        vl-convert is not installed.
    """
    converter = _converter()
    spec = json.dumps(_printable(chart.vega_lite(theme)), ensure_ascii=False)
    svg = _own_names(converter.vegalite_to_svg(spec, vl_version=VEGALITE), spec)
    name = f"<title>{escape(printable(chart.description, breakable=False, picture=True))}</title>"
    start = svg.index(">", svg.index("<svg")) + 1
    return f'{svg[: start - 1]} role="img">{name}{svg[start:]}'


def _printable(part: Any) -> Any:
    """The same with texts that can be set: some characters would stop the converter dead."""
    if isinstance(part, dict):
        return {key: _printable(value) for key, value in part.items()}
    if isinstance(part, list | tuple):
        return [_printable(value) for value in part]
    if isinstance(part, str) and not (part.isascii() and part.isprintable()):
        return printable(part, breakable=False, picture=True)
    return part


def _own_names(svg: str, spec: str) -> str:
    """Ids inside a picture that do not depend on how many were drawn before it.

    They also differ from those of other pictures, so that several may stand in one HTML page.
    """
    mark = hashlib.sha256(spec.encode("utf-8", "replace")).hexdigest()[:8]
    names = dict.fromkeys(re.findall(r'\bid="([^"]+)"', svg))
    stable = {name: f"c{mark}-{n}" for n, name in enumerate(names)}
    for old, new in stable.items():
        svg = svg.replace(f'id="{old}"', f'id="{new}"').replace(f"url(#{old})", f"url(#{new})")
    return svg


@functools.cache
def _converter() -> Any:
    try:
        import vl_convert
    except ImportError as error:
        from planner.errors import MissingPartError

        raise MissingPartError(
            "Charts on paper need vl-convert. Install it with: pip install vl-convert-python"
        ) from error
    vl_convert.register_font_directory(str(FONTS))
    return vl_convert


def number(value: float, digits: int = 4) -> float | None:
    """A value as JSON knows it: rounded, None where there is none."""
    return round(float(value), digits) if math.isfinite(value) else None


def numbers(values: Any, digits: int = 4) -> list[float | None]:
    """`number` of every value of a one-dimensional array."""
    return [number(value, digits) for value in np.asarray(values, float).ravel()]


def thinned(count: int, most: int) -> np.ndarray[Any, np.dtype[np.intp]]:
    """Indices that keep at most `most` of `count` points, both ends included."""
    if count <= most:
        return np.arange(count)
    return np.unique(np.round(np.linspace(0, count - 1, most)).astype(np.intp))


def shortened(text: str, most: int) -> str:
    """The text on one line, cut with an ellipsis where it is longer than `most` characters."""
    line = " ".join(text.split())
    return line if len(line) <= most else line[: most - 1].rstrip() + "…"


def wrapped(text: str, width: int, lines: int = 3) -> list[str]:
    """The text in at most `lines` lines of about `width` characters."""
    import textwrap

    return textwrap.wrap(text, max(width, 20), max_lines=lines, placeholder=" …") or [""]


def joined(words: Sequence[str]) -> str:
    """Words as a list in a sentence: ``a, b and c``."""
    if len(words) < 2:
        return "".join(words)
    return f"{', '.join(words[:-1])} and {words[-1]}"


__all__ = [
    "DARK", "FONT", "FONTS", "LIGHT", "MOST_ROWS", "Chart", "Spec", "Theme", "config", "finished",
    "joined", "number", "numbers", "shortened", "thinned", "to_svg", "wrapped",
]  # fmt: skip
