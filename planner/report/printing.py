"""Files to hand over: the shopping list, the report, the acceptance sheet, the drawings.

The ending of the file says what is written. Where typst is missing, a PDF becomes an HTML file
beside it, and the answer says so.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from planner.errors import InputError, MissingPartError
from planner.report.buying import BuyingList
from planner.report.document import Document, drawing_page
from planner.report.drawings import PAPERS, Panel, sheets
from planner.report.list_formats import list_document, to_csv, to_text, to_xlsx
from planner.room.model import Room
from planner.storage import write_atomically

LIST_ENDINGS = (".pdf", ".html", ".csv", ".xlsx", ".txt")
DOCUMENT_ENDINGS = (".pdf", ".html")
DRAWING_ENDINGS = (".dxf", ".pdf", ".html")


@dataclass(frozen=True, slots=True)
class Written:
    """A file that was written."""

    path: Path
    note: str = ""
    """Why it is not what was asked for; empty where it is."""


def write_list(
    path: str | Path,
    buying: BuyingList,
    *,
    paper: str = "a4",
    date: str = "",
    timestamp: int = 0,
) -> Written:
    """Write the shopping list as PDF, HTML, CSV, spreadsheet or plain text, by the file's ending.

    Parameters
    ----------
    path
        Ends in ``.pdf``, ``.html``, ``.csv``, ``.xlsx`` or ``.txt``.
    buying
        The list.
    paper
        ``a4``, ``a3`` or ``us-letter``.
    date
        As printed.
    timestamp
        The file's own date, from the input. [s since 1970]

    Raises
    ------
    InputError
        Another ending, an unknown paper, or a place that cannot be written to.
    """
    target = Path(path)
    ending = _ending(target, LIST_ENDINGS)
    if ending in DOCUMENT_ENDINGS:
        _check_paper(paper)
        document = list_document(buying, paper=paper, date=date, timestamp=timestamp)
        return write_document(target, document)
    writers: dict[str, Callable[[], bytes | str]] = {
        # A byte-order mark, so that spreadsheets read the CSV as UTF-8.
        ".csv": lambda: "\ufeff" + to_csv(buying),
        ".txt": lambda: to_text(buying),
        ".xlsx": lambda: to_xlsx(buying, timestamp=timestamp),
    }
    return Written(write_atomically(target, writers[ending]()))


def write_drawings(
    path: str | Path,
    room: Room,
    panels: Sequence[Panel],
    *,
    paper: str = "a4",
    units: str = "m",
    timestamp: int = 0,
) -> Written:
    """Write plan, ceiling and every wall as DXF, PDF or HTML, by the file's ending.

    Parameters
    ----------
    path
        Ends in ``.dxf``, ``.pdf`` or ``.html``.
    room
        The room.
    panels
        Panels in their places, numbered as on the list.
    paper
        ``a4``, ``a3`` or ``us-letter``; DXF is in true size whatever the paper.
    units
        ``m`` or ``ft``.
    timestamp
        The file's own date, from the input. [s since 1970]

    Raises
    ------
    InputError
        Another ending, an unknown paper, or a place that cannot be written to.
    """
    target = Path(path)
    ending = _ending(target, DRAWING_ENDINGS)
    _check_paper(paper)
    drawn = sheets(room, panels, paper=paper, units=units)
    if ending == ".dxf":
        from planner.report.dxf import to_dxf

        return Written(write_atomically(target, to_dxf([sheet.drawing for sheet in drawn])))
    return write_document(
        target,
        Document(
            title="Drawings",
            subtitle=room.name,
            sections=tuple(drawing_page(sheet) for sheet in drawn),
            paper=paper,
            timestamp=timestamp,
            footer=f"Drawings, {room.name}",
        ),
    )


def write_document(path: str | Path, document: Document) -> Written:
    """Write a document as PDF or HTML, by the file's ending.

    Raises
    ------
    InputError
        Another ending, an unknown paper, or a place that cannot be written to.
    """
    target = Path(path)
    ending = _ending(target, DOCUMENT_ENDINGS)
    _check_paper(document.paper)
    from planner.report.html import to_html
    from planner.report.typeset import to_pdf

    if ending == ".html":
        return Written(write_atomically(target, to_html(document)))
    try:
        return Written(write_atomically(target, to_pdf(document)))
    except MissingPartError as missing:
        beside = target.with_suffix(".html")
        note = f"{missing} Written as {beside.name} instead."
        return Written(write_atomically(beside, to_html(document)), note)


def _ending(path: Path, known: tuple[str, ...]) -> str:
    ending = path.suffix.lower()
    if ending not in known:
        raise InputError(
            f"{ending or 'no ending'} is no kind of file that can be written here",
            file=path,
            cure=f"End the name in {', '.join(known)}.",
        )
    return ending


def _check_paper(paper: str) -> None:
    if paper not in PAPERS:
        raise InputError(f"{paper!r} is no paper known here", cure=f"Take {', '.join(PAPERS)}.")
