"""A paper before it is printed: sections of text, lists, tables and pictures, as plain data.

The same document becomes a PDF (`planner.report.typeset`) or one HTML file (`planner.report.html`).
All text in it is data: nothing is read as markup by either.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

from planner.report.chart import Chart, to_svg
from planner.report.drawings import Sheet


@dataclass(frozen=True, slots=True)
class Words:
    """A paragraph."""

    text: str
    strong: bool = False


@dataclass(frozen=True, slots=True)
class Bullets:
    """Short paragraphs, one dot each."""

    entries: tuple[str, ...]
    title: str = ""


@dataclass(frozen=True, slots=True)
class Table:
    """Rows under headings."""

    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    right: tuple[int, ...] = ()
    """Columns of numbers, set flush right."""
    wide: int | tuple[int, ...] | None = None
    """Columns that share the width that is left; the first by default, none for −1."""
    total: tuple[str, ...] | None = None
    """A last row that sums up, printed once."""
    caption: str = ""
    small: bool = False


@dataclass(frozen=True, slots=True)
class Picture:
    """A drawing or chart as SVG text."""

    svg: str
    words: str
    """What it shows, for those who do not see it."""
    caption: str = ""
    width_mm: float | None = None
    """Width on paper; as wide as the text by default. [mm]"""
    to_scale: bool = False
    """Its width must not be changed."""


@dataclass(frozen=True, slots=True)
class Row:
    """Pictures side by side."""

    pictures: tuple[Picture, ...]


@dataclass(frozen=True, slots=True)
class NewPage:
    """What follows begins a page."""

    landscape: bool = False


MM_PER_PIXEL = 0.28
"""A chart's pixel on paper, which makes its type 10 pt. [mm]"""

Block = Words | Bullets | Table | Picture | Row | NewPage


@dataclass(frozen=True, slots=True)
class Section:
    """Blocks under a heading."""

    title: str
    blocks: tuple[Block, ...]
    level: int = 1
    new_page: bool = False
    landscape: bool = False


@dataclass(frozen=True, slots=True)
class Document:
    """Everything that is printed."""

    title: str
    subtitle: str
    sections: tuple[Section, ...]
    paper: str = "a4"
    """``a4``, ``a3`` or ``us-letter``."""
    date: str = ""
    """As printed; never today's by itself."""
    timestamp: int = 0
    """Of the input, in seconds since 1970: the file's own date. [s]"""
    footer: str = ""
    contents: bool = False
    """With a list of its sections on the first page."""


def picture(chart: Chart, *, caption: str = "", width_mm: float | None = None) -> Picture:
    """A chart as a picture with its description."""
    svg = to_svg(chart)
    if width_mm is None:
        width_mm = min(float(svg.partition('width="')[2].partition('"')[0]) * MM_PER_PIXEL, 174.0)
    return Picture(svg, chart.description, caption, width_mm)


def drawing_page(sheet: Sheet, blocks: Sequence[Block] = ()) -> Section:
    """A drawing at its true scale on a page of its own."""
    shown = Picture(sheet.svg, sheet.drawing.description, width_mm=sheet.size[0], to_scale=True)
    title = f"Drawing: {sheet.drawing.title.lower()}"
    return Section(title, (shown, *blocks), new_page=True, landscape=sheet.landscape)


@dataclass(slots=True)
class Builder:
    """Collects blocks of one section; what has nothing to say adds nothing."""

    blocks: list[Block] = field(default_factory=list)

    def words(self, *texts: str, strong: bool = False) -> Builder:
        """Add paragraphs; empty ones are left out."""
        self.blocks += [Words(text, strong) for text in texts if text]
        return self

    def bullets(self, entries: Sequence[str], title: str = "") -> Builder:
        """Add a list of entries, if there are any."""
        if entries:
            self.blocks.append(Bullets(tuple(entries), title))
        return self

    def table(self, heads: Sequence[str], rows: Sequence[Sequence[Any]], **more: Any) -> Builder:
        """Add a table, if it has rows."""
        if rows:
            cells = tuple(tuple(str(cell) for cell in row) for row in rows)
            self.blocks.append(Table(tuple(heads), cells, **more))
        return self

    def chart(self, chart: Chart | None, **more: Any) -> Builder:
        """Add a chart, if there is one."""
        if chart is not None:
            self.blocks.append(picture(chart, **more))
        return self

    def section(self, title: str, **more: Any) -> list[Section]:
        """The section, or none where nothing was added."""
        return [Section(title, tuple(self.blocks), **more)] if self.blocks else []
