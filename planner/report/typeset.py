"""A `Document` as PDF: typeset by Typst from the shipped template and fonts.

The PDF is tagged (PDF/UA-1), its fonts are embedded, and identical documents give identical bytes.
Nothing is fetched, and nothing outside the shipped template, fonts and the document is read.
"""

from __future__ import annotations

import functools
import json
from collections.abc import Iterator
from itertools import count
from pathlib import Path
from typing import Any

from planner.errors import MissingPartError
from planner.report.document import (
    Block,
    Bullets,
    Document,
    NewPage,
    Picture,
    Row,
    Section,
    Table,
    Words,
)
from planner.report.glyphs import printable
from planner.report.palette import FONTS

TEMPLATE = Path(__file__).parent / "templates" / "document.typ"


def to_pdf(document: Document) -> bytes:
    """The document as PDF.

    Raises
    ------
    MissingPartError
        Typst is not installed.
    """
    typst = _library()
    files: dict[str, bytes] = {"main.typ": TEMPLATE.read_bytes()}
    data = _Data(files).document(document)
    files["data.json"] = json.dumps(data, ensure_ascii=False, allow_nan=False).encode("utf-8")
    options = {
        "format": "pdf",
        "font_paths": _fonts(),
        "ignore_system_fonts": True,
        "timestamp": document.timestamp,
    }
    try:
        pdf, _ = typst.compile_with_warnings(files, pdf_standards=["ua-1"], **options)
    except typst.TypstError:
        # Some pair of glyphs without a meaning of its own: the paper still matters more than the
        # profile, and its tags stay in it.
        pdf, _ = typst.compile_with_warnings(files, **options)
    return bytes(pdf)


@functools.cache
def _fonts() -> list[str]:
    return [str(FONTS)]


def _library() -> Any:
    try:
        import typst
    except ImportError as error:
        raise MissingPartError(
            "A PDF needs typst. Install it with: pip install typst – or ask for an .html file, "
            "which needs nothing more."
        ) from error
    return typst


class _Data:
    """Turns a document into what the template reads, and its pictures into files beside it."""

    def __init__(self, files: dict[str, bytes]) -> None:
        self.files = files
        self.numbers = count(1)

    def document(self, document: Document) -> dict[str, Any]:
        return {
            "title": printable(document.title) or "Untitled",
            "subtitle": printable(document.subtitle),
            "footer": _short(printable(document.footer or document.title, breakable=False)),
            "paper": document.paper,
            "contents": document.contents,
            "groups": list(self.groups(document.sections)),
        }

    def groups(self, sections: tuple[Section, ...]) -> Iterator[dict[str, Any]]:
        """Sections by page orientation; a landscape one stands on pages of its own."""
        group: list[dict[str, Any]] = []
        new_page = False
        for section in sections:
            if section.landscape or section.new_page:
                if group:
                    yield {"sections": group, "new_page": new_page, "landscape": False}
                group, new_page = [], True
            if section.landscape:
                yield {"sections": [self.section(section)], "new_page": True, "landscape": True}
                continue
            group.append(self.section(section))
        if group:
            yield {"sections": group, "new_page": new_page, "landscape": False}

    def section(self, section: Section) -> dict[str, Any]:
        return {
            "title": printable(section.title) or "–",
            "level": section.level,
            "blocks": [self.block(block) for block in section.blocks],
        }

    def block(self, block: Block) -> dict[str, Any]:
        match block:
            case Words(text, strong):
                return {"kind": "words", "text": printable(text), "strong": strong}
            case Bullets(entries, title):
                texts = [printable(entry) for entry in entries]
                return {"kind": "bullets", "title": printable(title), "entries": texts}
            case Table():
                return self.table(block)
            case Picture():
                return {"kind": "picture", **self.picture(block)}
            case Row(pictures):
                return {"kind": "row", "pictures": [self.picture(one) for one in pictures]}
            case NewPage():
                return {"kind": "words", "text": "", "strong": False}

    def table(self, table: Table) -> dict[str, Any]:
        wide = 0 if table.wide is None else table.wide
        shared = wide if isinstance(wide, tuple) else (wide,)
        return {
            "kind": "table",
            "heads": [printable(head) or "\u00a0" for head in table.heads],
            "rows": [[printable(cell) for cell in row] for row in table.rows],
            "total": [printable(cell) for cell in table.total] if table.total else None,
            "right": list(table.right),
            "columns": [int(n in shared) for n in range(len(table.heads))],
            "caption": printable(table.caption),
            "small": table.small,
        }

    def picture(self, picture: Picture) -> dict[str, Any]:
        name = f"picture-{next(self.numbers)}.svg"
        self.files[name] = picture.svg.encode("utf-8", "replace")
        return {
            "file": name,
            "words": printable(picture.words, breakable=False) or "Picture",
            "caption": printable(picture.caption),
            "width": picture.width_mm,
            "to_scale": picture.to_scale,
        }


def _short(text: str) -> str:
    return text if len(text) <= 80 else text[:79] + "…"
