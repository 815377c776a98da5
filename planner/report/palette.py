"""Colours, markers and dashes of this program, for charts, drawings and paper.

Found by search: every series colour has a contrast of at least 3:1 on white and on the dark page,
and they stay apart under simulated colour blindness. Two pairs merge in greyscale, therefore a
series is always told by colour, marker and dash together, and text never has a series colour.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

FONTS = Path(__file__).parent / "fonts"
"""Folder of the shipped fonts."""
FONT = "Planner Sans"
"""The shipped typeface, see ``fonts/``."""
FONT_STACK = "'Planner Sans', 'Noto Sans', 'DejaVu Sans', sans-serif"


@dataclass(frozen=True, slots=True)
class Style:
    """How one series looks."""

    colour: str
    marker: str
    """A Vega symbol shape."""
    dash: tuple[int, ...]
    """Lengths of line and gap; empty for a solid line. [px]"""


STYLES: dict[str, Style] = {
    "untreated": Style("#5559a4", "triangle-up", ()),
    "option-a": Style("#d68005", "circle", (6, 3)),
    "option-b": Style("#499eb3", "diamond", (2, 2)),
    "measured": Style("#b03324", "square", ()),
}
"""The four series that a chart may hold, in their fixed order."""

NEUTRAL = "#6b6b6b"


@dataclass(frozen=True, slots=True)
class Theme:
    """Colours of a page."""

    page: str
    ink: str
    """Text."""
    soft: str
    """Secondary text, at least 4.5:1 on the page."""
    grid: str
    axis: str
    zone: str
    """The target's steps."""
    zone_edge: str


LIGHT = Theme("#ffffff", "#1d1f24", "#55585f", "#e4e5e8", "#83868d", "#8a8d94", "#5c5f66")
DARK = Theme("#0e1117", "#eceef2", "#b3b7c0", "#2a2e37", "#7d818b", "#7d818b", "#a4a8b1")
