"""Drawings a fitter can work from: plan, wall elevations, reflected ceiling plan, to scale.

A `Drawing` holds its marks in metres; here it is fitted to a sheet of paper at a usual scale, and
becomes SVG (true to scale in millimetres, or for the screen). `planner.report.dxf` writes it as DXF.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

from planner.report.drawing_marks import Drawing
from planner.report.drawing_parts import PLAN, Panel, corner_name, surface_title
from planner.report.drawing_svg import MARGIN, to_screen_svg, to_svg
from planner.report.drawing_views import ceiling_plan, elevation, plan, view
from planner.report.palette import LIGHT, Theme
from planner.room.model import Room

PAPERS: dict[str, tuple[float, float]] = {
    "a4": (210.0, 297.0),
    "a3": (297.0, 420.0),
    "us-letter": (215.9, 279.4),
}
"""Width and height of the sheets, upright. [mm]"""

SCALES = (20, 25, 50, 100, 200)
"""Scales tried from the largest down; a small room fits one of the first three. [-]"""

BORDER = (16.0, 26.0)
"""Paper kept free at the sides and at head and foot together with the page's own lines. [mm]"""


@dataclass(frozen=True, slots=True)
class Sheet:
    """A drawing fitted to a sheet of paper."""

    drawing: Drawing
    paper: str
    landscape: bool

    @property
    def svg(self) -> str:
        """The drawing, true to scale."""
        return to_svg(self.drawing)

    @property
    def size(self) -> tuple[float, float]:
        """Width and height of the drawing on the sheet, with its margin. [mm]."""
        width, height = self.drawing.paper_size
        return width + 2 * MARGIN, height + 2 * MARGIN


def sheets(
    room: Room,
    panels: Iterable[Panel] = (),
    *,
    paper: str = "a4",
    units: str = "m",
    only_used: bool = False,
) -> list[Sheet]:
    """Plan, ceiling and every wall, each at the largest scale that fits the sheet.

    Parameters
    ----------
    room
        The room.
    panels
        Panels in their places, numbered as on the list.
    paper
        ``a4``, ``a3`` or ``us-letter``.
    units
        ``m`` or ``ft``.
    only_used
        Leave out walls and ceiling without panels.
    """
    placed = list(panels)
    names = [PLAN, "ceiling", *room.wall_names]
    if only_used:
        used = {panel.surface for panel in placed}
        names = [name for name in names if name == PLAN or name in used]
    return [sheet(room, name, placed, paper=paper, units=units) for name in names]


def sheet(
    room: Room, name: str, panels: Sequence[Panel] = (), *, paper: str = "a4", units: str = "m"
) -> Sheet:
    """One view fitted to a sheet of paper, upright or on its side."""

    def build(scale: float) -> Drawing:
        return view(room, name, panels, scale=scale, units=units)

    return fitted(build, paper)


def fitted(build: Callable[[float], Drawing], paper: str) -> Sheet:
    """What `build` draws, at the largest of `SCALES` that the paper holds.

    Raises
    ------
    ValueError
        Paper that is none of `PAPERS`.
    """
    if paper not in PAPERS:
        raise ValueError(f"{paper!r} is no paper known here; take {', '.join(PAPERS)}")
    short, long = PAPERS[paper]
    drawing = build(SCALES[-1])
    for scale in SCALES:
        drawing = build(scale)
        width, height = (size + 2 * MARGIN for size in drawing.paper_size)
        for landscape in (False, True):
            across, up = (long, short) if landscape else (short, long)
            if width <= across - 2 * BORDER[0] and height <= up - 2 * BORDER[1]:
                return Sheet(drawing, paper, landscape)
    return Sheet(drawing, paper, drawing.paper_size[0] > drawing.paper_size[1])


def on_screen(
    room: Room,
    name: str = PLAN,
    panels: Iterable[Panel] = (),
    *,
    units: str = "m",
    dimensions: bool = False,
    theme: Theme = LIGHT,
) -> str:
    """A view for a browser page as SVG text: it fills the width, its type stays readable.

    Parameters
    ----------
    room
        The room.
    name
        ``plan``, ``ceiling`` or the name of a wall.
    panels
        Panels in their places.
    units
        ``m`` or ``ft``.
    dimensions
        With dimensions, as on paper.
    theme
        Light or dark page.
    """
    length, width, height = room.dimensions
    # Drawn as if 150 mm wide, the type then has about 12 px in a column of 600 px.
    scale = max(length, width, height) * 1000.0 / 150.0
    return to_screen_svg(
        view(room, name, panels, scale=scale, units=units, dimensions=dimensions), theme
    )


__all__ = [
    "PAPERS", "PLAN", "SCALES", "Drawing", "Panel", "Sheet", "ceiling_plan", "corner_name",
    "elevation", "fitted", "on_screen", "plan", "sheet", "sheets", "surface_title", "to_screen_svg",
    "to_svg", "view",
]  # fmt: skip
