"""Drawings as DXF for the joiner: true size in millimetres or inches, one layer per kind of thing.

The views stand side by side in model space. Identical drawings give identical bytes.
"""

from __future__ import annotations

import io
from collections.abc import Sequence
from typing import Any

from planner.report.drawing_marks import Circle, Drawing, Label, Line, Mark, Outline, Point
from planner.room.lengths import METRES_PER

LAYERS: dict[str, tuple[str, int]] = {
    "room": ("ROOM", 7),
    "opening": ("OPENINGS", 4),
    "patch": ("COVERINGS", 8),
    "keep-out": ("KEEP_CLEAR", 1),
    "hatching": ("KEEP_CLEAR", 1),
    "panel": ("PANELS", 5),
    "section": ("PANELS_IN_PLAN", 5),
    "number": ("PANEL_NUMBERS", 7),
    "position": ("POSITIONS", 3),
    "below": ("POSITIONS", 3),
    "front": ("NOTES", 7),
    "dimension": ("DIMENSIONS", 8),
    "heading": ("NOTES", 7),
    "note": ("NOTES", 7),
    "plated": ("NOTES", 7),
    "text": ("NOTES", 7),
    "scale-bar": ("NOTES", 7),
    "scale-dark": ("NOTES", 7),
    "scale-light": ("NOTES", 7),
}
"""Layer and colour number of every kind of mark; what is missing here is not drawn."""

SPACING = 1.0
"""Between two views. [m]"""


def to_dxf(drawings: Sequence[Drawing]) -> bytes:
    """All views in one DXF file (R2010).

    Parameters
    ----------
    drawings
        Views with the same units; metric ones are drawn in millimetres, imperial ones in inches.

    Raises
    ------
    MissingPartError
        ezdxf is not installed.
    """
    ezdxf = _library()
    before = ezdxf.options.write_fixed_meta_data_for_testing
    ezdxf.options.write_fixed_meta_data_for_testing = True
    try:
        imperial = bool(drawings) and drawings[0].units == "ft"
        document = ezdxf.new("R2010", setup=False)
        document.units = ezdxf.units.IN if imperial else ezdxf.units.MM
        document.header["$MEASUREMENT"] = 0 if imperial else 1
        document.styles.add("PLANNER", font="txt")
        for name, colour in dict(LAYERS.values()).items():
            document.layers.add(name, color=colour)
        per_metre = 1.0 / METRES_PER["in"] if imperial else 1000.0
        across = 0.0
        for drawing in drawings:
            left, _, right, _ = drawing.bounds
            writer = _Writer(document.modelspace(), drawing.scale, per_metre, across - left)
            for mark in drawing.marks:
                writer.add(mark)
            across += right - left + SPACING
        text = io.StringIO()
        document.write(text)
        return text.getvalue().encode("utf-8", "replace")
    finally:
        ezdxf.options.write_fixed_meta_data_for_testing = before


class _Writer:
    """Puts the marks of one view into model space."""

    def __init__(self, space: Any, scale: float, per_metre: float, shift: float) -> None:
        self.space, self.scale = space, scale
        self.per_metre, self.shift = per_metre, shift

    def place(self, point: Point) -> Point:
        return (point[0] + self.shift) * self.per_metre, point[1] * self.per_metre

    def add(self, mark: Mark) -> None:
        if mark.layer not in LAYERS:
            return
        layer = {"layer": LAYERS[mark.layer][0]}
        match mark:
            case Line(start, end, _):
                self.space.add_line(self.place(start), self.place(end), layer)
            case Circle(centre, radius, _):
                self.space.add_circle(self.place(centre), radius * self.per_metre, layer)
            case Outline(points, _, _):
                corners = [self.place(point) for point in points]
                self.space.add_lwpolyline(corners, close=True, dxfattribs=layer)
            case Label():
                self._text(mark, layer)

    def _text(self, label: Label, layer: dict[str, Any]) -> None:
        from ezdxf.enums import TextEntityAlignment as Align

        align = {
            "start": Align.MIDDLE_LEFT,
            "middle": Align.MIDDLE_CENTER,
            "end": Align.MIDDLE_RIGHT,
        }
        # The height of a capital letter, which is what DXF means by text height.
        height = 0.72 * label.size * self.scale / 1000.0 * self.per_metre
        entity = self.space.add_text(
            plain(label.text),
            height=height,
            rotation=label.angle,
            dxfattribs={**layer, "style": "PLANNER"},
        )
        entity.set_placement(self.place(label.at), align=align[label.anchor])


def plain(text: str) -> str:
    """Text that DXF shows as typed: its own codes (``%%``, ``^``) are written out."""
    line = "".join(c if c.isprintable() else " " for c in text)
    return line.replace("^", "^ ").replace("%%", "%%%%%%")


def _library() -> Any:
    try:
        import ezdxf
        import ezdxf.units
    except ImportError as error:
        from planner.errors import MissingPartError

        raise MissingPartError("DXF needs ezdxf. Install it with: pip install ezdxf") from error
    return ezdxf
