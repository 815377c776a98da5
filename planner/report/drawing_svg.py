"""Drawings as SVG text, in millimetres of paper or filling a browser page."""

from __future__ import annotations

import functools
import re
from collections.abc import Callable
from dataclasses import dataclass
from html import escape

from planner.report.drawing_marks import Circle, Drawing, Label, Line, Mark, Outline, Point
from planner.report.glyphs import printable
from planner.report.palette import DARK, FONT_STACK, LIGHT, Theme

MARGIN = 2.0
"""Around everything drawn. [mm]"""
_NOT_IN_XML = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")


Place = Callable[[Point], Point]


@dataclass(frozen=True, slots=True)
class Pen:
    """How a layer looks; colours are names of the theme or plain values."""

    width: float = 0.18
    """[mm]"""
    stroke: str = "ink"
    fill: str = "none"
    dash: str = ""


PENS: dict[str, Pen] = {
    "room": Pen(0.6),
    "opening": Pen(0.25, fill="page"),
    "break": Pen(1.1, stroke="page"),
    "patch": Pen(0.18, stroke="soft", dash="1.6 1"),
    "keep-out": Pen(0.25),
    "hatching": Pen(0.12, stroke="soft"),
    "panel": Pen(0.35, stroke="panel_edge", fill="panel"),
    "section": Pen(0.25, stroke="panel_edge", fill="panel"),
    "position": Pen(0.3, fill="page"),
    "below": Pen(0.18, stroke="soft", dash="0.8 0.6"),
    "front": Pen(0.3, fill="ink"),
    "dimension": Pen(0.12),
    "scale-dark": Pen(0.0, fill="ink"),
    "scale-light": Pen(0.0, fill="page"),
    "scale-bar": Pen(0.15),
}
"""Look of every layer of lines."""

PANEL = {LIGHT: ("#e7e8f4", "#3b3e78"), DARK: ("#2b2e55", "#9ea1d8")}
"""Fill and edge of a panel on each page."""


def to_svg(drawing: Drawing, theme: Theme = LIGHT) -> str:
    """The drawing as SVG whose size on paper is true to its scale."""
    width, height = (size + 2 * MARGIN for size in drawing.paper_size)
    size = f'width="{width:.3f}mm" height="{height:.3f}mm"'
    return _document(
        drawing, theme, size, functools.partial(printable, breakable=False, picture=True)
    )


def to_screen_svg(drawing: Drawing, theme: Theme = LIGHT) -> str:
    """The drawing as SVG that fills the width it is given."""
    return _document(drawing, theme, 'width="100%"', clean)


def clean(text: str) -> str:
    """Text without the characters that XML cannot hold."""
    return _NOT_IN_XML.sub("\ufffd", text)


def _document(drawing: Drawing, theme: Theme, size: str, legible: Callable[[str], str]) -> str:
    left, bottom, right, top = drawing.bounds
    width = drawing.paper(right - left) + 2 * MARGIN
    height = drawing.paper(top - bottom) + 2 * MARGIN

    def place(point: Point) -> Point:
        return MARGIN + drawing.paper(point[0] - left), MARGIN + drawing.paper(top - point[1])

    body = "\n".join(_mark(mark, place, drawing, theme, legible) for mark in drawing.marks)
    words = escape(legible(drawing.description or drawing.title))
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" {size} '
        f'viewBox="0 0 {width:.3f} {height:.3f}" role="img" font-family="{FONT_STACK}">'
        f'<title>{words}</title>\n<rect width="100%" height="100%" fill="{theme.page}"/>\n'
        f"{body}\n</svg>\n"
    )


def _colour(name: str, theme: Theme) -> str:
    if name in ("panel", "panel_edge"):
        return PANEL[theme][name == "panel_edge"]
    return str(getattr(theme, name, name))


def _look(layer: str, theme: Theme) -> str:
    pen = PENS[layer]
    look = f'class="{layer}" fill="{_colour(pen.fill, theme)}"'
    if pen.width:
        look += f' stroke="{_colour(pen.stroke, theme)}" stroke-width="{pen.width:g}"'
    return look + (f' stroke-dasharray="{pen.dash}"' if pen.dash else "")


def _mark(
    mark: Mark, place: Place, drawing: Drawing, theme: Theme, legible: Callable[[str], str]
) -> str:
    match mark:
        case Line(start, end, layer):
            (x1, y1), (x2, y2) = place(start), place(end)
            return (
                f'<line {_look(layer, theme)} x1="{x1:.3f}" y1="{y1:.3f}" '
                f'x2="{x2:.3f}" y2="{y2:.3f}"/>'
            )
        case Circle(centre, radius, layer):
            x, y = place(centre)
            return f'<circle {_look(layer, theme)} cx="{x:.3f}" cy="{y:.3f}" r="{drawing.paper(radius):.3f}"/>'
        case Outline(points, layer, name):
            corners = " ".join("{:.3f},{:.3f}".format(*place(point)) for point in points)
            named = f' data-name="{escape(legible(name))}"' if name else ""
            return f'<polygon {_look(layer, theme)}{named} points="{corners}"/>'
        case Label():
            return _text(mark, place, theme, legible)


def _text(label: Label, place: Place, theme: Theme, legible: Callable[[str], str]) -> str:
    x, y = place(label.at)
    drop = 0.36 * label.size
    turn = f' transform="rotate({-label.angle:g} {x:.3f} {y:.3f})"' if label.angle else ""
    weight = ' font-weight="bold"' if label.layer in ("heading", "number") else ""
    shown = escape(legible(label.text))
    text = (
        f'<text class="{label.layer}" x="{x:.3f}" y="{y + drop:.3f}" font-size="{label.size:g}" '
        f'text-anchor="{label.anchor}" fill="{theme.ink}"{weight}{turn}>{shown}</text>'
    )
    if label.layer != "plated":
        return text
    width, height = label.width + 1.2, label.size * 1.3
    return (
        f'<rect fill="{theme.page}" x="{x - width / 2:.3f}" y="{y - height / 2:.3f}" '
        f'width="{width:.3f}" height="{height:.3f}"{turn}/>{text}'
    )
