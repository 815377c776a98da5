"""A `Document` as one HTML file: no script, no other file, readable on screen and printable."""

from __future__ import annotations

import re
from html import escape

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
from planner.report.drawing_svg import clean
from planner.report.palette import FONT_STACK

PAGE = {"a4": "A4", "a3": "A3", "us-letter": "letter"}

STYLE = f"""
:root {{ color-scheme: light; }}
body {{ font-family: {FONT_STACK}; color: #1d1f24; background: #fff; line-height: 1.45;
  max-width: 52rem; margin: 2rem auto; padding: 0 1rem; overflow-wrap: anywhere; }}
h1, h2 {{ color: #3b3e78; }} h1 {{ margin-bottom: 0.2rem; }}
.subtitle, figcaption, caption, footer {{ color: #55585f; font-size: 0.9rem; }}
.scroll {{ overflow-x: auto; }}
table {{ border-collapse: collapse; width: 100%; margin: 1rem 0; font-size: 0.9rem;
  font-variant-numeric: tabular-nums; }}
table.compact {{ width: auto; }}
caption {{ text-align: left; padding-bottom: 0.4rem; }}
th {{ text-align: left; vertical-align: bottom; border-bottom: 1.5px solid #1d1f24; }}
td {{ vertical-align: top; border-bottom: 1px solid #d5d7dc; }}
th, td {{ padding: 0.3rem 0.5rem; }} .right {{ text-align: right; white-space: nowrap; }}
td {{ min-width: 2.5rem; }}
tfoot td {{ font-weight: bold; border-top: 1.5px solid #1d1f24; }}
figure {{ margin: 1.2rem 0; }} figure svg {{ max-width: 100%; height: auto; }}
.row {{ display: grid; grid-template-columns: repeat(auto-fit, minmax(18rem, 1fr)); gap: 1rem; }}
@media print {{ body {{ max-width: none; margin: 0; padding: 0; font-size: 9.5pt; }}
  h2, h3 {{ break-after: avoid; }} figure, tr {{ break-inside: avoid; }}
  .new-page {{ break-before: page; }} thead {{ display: table-header-group; }} }}
"""


def to_html(document: Document) -> str:
    """The document as one self-contained HTML file."""
    sections = "\n".join(_section(section, n) for n, section in enumerate(document.sections, 1))
    contents = ""
    if document.contents:
        entries = "".join(
            f'<li><a href="#section-{n}">{_text(section.title)}</a></li>'
            for n, section in enumerate(document.sections, 1)
            if section.level == 1
        )
        contents = f'<nav aria-label="Contents"><ol>{entries}</ol></nav>'
    return (
        "<!DOCTYPE html>\n"
        '<html lang="en"><head><meta charset="utf-8">'
        '<meta name="viewport" content="width=device-width, initial-scale=1">'
        '<meta http-equiv="Content-Security-Policy" '
        "content=\"default-src 'none'; style-src 'unsafe-inline'\">"
        f"<title>{_plain(document.title)}</title>"
        f"<style>{STYLE}@page {{ size: {PAGE[document.paper]}; margin: 16mm; }}</style></head>\n"
        f"<body><header><h1>{_text(document.title)}</h1>"
        f'<p class="subtitle">{_text(document.subtitle)}</p></header>\n{contents}'
        f"<main>\n{sections}\n</main>\n"
        f"<footer><p>{_text(document.footer or document.title)}</p></footer></body></html>\n"
    )


def _plain(text: str) -> str:
    return escape(clean(text))


def _text(text: str) -> str:
    """Text of its own direction, so that right-to-left names do not turn what stands beside."""
    shown = _plain(text)
    return (
        f"<bdi>{shown}</bdi>"
        if re.search("[\u0590-\u08ff\u200e-\u202e\u2066-\u2069]", text)
        else shown
    )


def _section(section: Section, number: int) -> str:
    level = min(section.level + 1, 6)
    mark = ' class="new-page"' if section.new_page or section.landscape else ""
    body = "\n".join(_block(block) for block in section.blocks)
    return (
        f'<section{mark} id="section-{number}"><h{level}>{_text(section.title)}</h{level}>\n'
        f"{body}\n</section>"
    )


def _block(block: Block) -> str:
    match block:
        case Words(text, strong):
            shown = _text(text)
            return f"<p><strong>{shown}</strong></p>" if strong else f"<p>{shown}</p>"
        case Bullets(entries, title):
            head = f"<p><strong>{_text(title)}</strong></p>" if title else ""
            return head + "<ul>" + "".join(f"<li>{_text(e)}</li>" for e in entries) + "</ul>"
        case Table():
            return _table(block)
        case Picture():
            return _picture(block)
        case Row(pictures):
            return f'<div class="row">{"".join(_picture(one) for one in pictures)}</div>'
        case NewPage():
            return ""


def _picture(picture: Picture) -> str:
    caption = f"<figcaption>{_text(picture.caption)}</figcaption>" if picture.caption else ""
    return f"<figure>{picture.svg}{caption}</figure>"


def _table(table: Table) -> str:
    def cells(row: tuple[str, ...], tag: str, more: str = "") -> str:
        sides = [' class="right"' if n in table.right else "" for n in range(len(row))]
        return "".join(
            f"<{tag}{more}{side}>{_text(cell)}</{tag}>"
            for cell, side in zip(row, sides, strict=True)
        )

    caption = f"<caption>{_text(table.caption)}</caption>" if table.caption else ""
    body = "".join(f"<tr>{cells(row, 'td')}</tr>" for row in table.rows)
    foot = f"<tfoot><tr>{cells(table.total, 'td')}</tr></tfoot>" if table.total else ""
    head = cells(table.heads, "th", ' scope="col"')
    look = ' class="compact"' if table.wide == -1 else ""
    return (
        f'<div class="scroll"><table{look}>{caption}<thead><tr>{head}</tr></thead>'
        f"<tbody>{body}</tbody>{foot}</table></div>"
    )
