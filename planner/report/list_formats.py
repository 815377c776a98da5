"""The shopping list as a document, plain text, CSV and spreadsheet."""

from __future__ import annotations

import csv
import io
from collections import Counter
from collections.abc import Sequence
from typing import Any

from planner.report.buying import BuyingLine, BuyingList
from planner.report.cutting import Bar
from planner.report.document import Block, Builder, Document, Section
from planner.report.quantities import NONE, Quantities, money

HEADS = ("no.", "panels", "item", "pieces", "packs", "area", "thick", "weight", "cost", "spare")
LEADING = tuple("=+-@＝＋－＠")


def list_document(
    buying: BuyingList,
    *,
    paper: str = "a4",
    date: str = "",
    timestamp: int = 0,
) -> Document:
    """The list as a document for PDF or HTML."""
    subtitle = " – ".join(part for part in (buying.room, date) if part)
    return Document(
        title=f"Shopping list: {buying.name}",
        subtitle=subtitle,
        sections=tuple(list_sections(buying)),
        paper=paper,
        date=date,
        timestamp=timestamp,
        footer=f"Shopping list, {buying.room}",
    )


def list_sections(buying: BuyingList, *, level: int = 1) -> list[Section]:
    """Products, raw goods, fixings, notes and cautions as sections."""
    show = Quantities(buying.units)
    blocks: list[Block] = _products(buying, show).blocks
    sections = [Section("What to buy", tuple(blocks), level)]
    sections += _raw(buying, show).section("Raw goods for panels built by hand", level=level)
    sections += _fixings(buying).section("Fixings", level=level)
    care = Builder().bullets(buying.notes, "Not known, or made up")
    care.bullets(buying.assumptions, "Assumed").bullets(buying.cautions, "Take care")
    sections += care.section("Before you buy", level=level)
    return sections


def _products(buying: BuyingList, show: Quantities) -> Builder:
    rows = [
        (
            str(line.number),
            line.panels or NONE,
            _described(line),
            NONE if line.pieces is None else str(line.pieces),
            f"{line.packs} × {_pack(line, show)}",
            show.area(line.area_m2),
            show.small(line.thickness_mm),
            show.weight(line.weight_kg),
            money(line.cost),
            f"{line.spare_percent:.0f} %",
        )
        for line in buying.lines
    ]
    heads = [*HEADS]
    heads[8] = f"cost ({buying.currency})"
    total = ("", "", "total", "", "", show.area(buying.area_m2), "", show.weight(buying.weight_kg),
             money(buying.total), "")  # fmt: skip
    builder = Builder().table(
        heads, rows, right=(3, 4, 5, 6, 7, 8, 9), wide=2, total=total, small=True
    )
    if not buying.lines:
        builder.words("Nothing has to be bought.")
    if not buying.is_complete:
        builder.words("The total is incomplete: it leaves out what has no price.", strong=True)
    return builder


def _described(line: BuyingLine) -> str:
    parts = [line.item]
    if line.where:
        parts.append(f"on {line.where}")
    parts.append(
        f"fire class declared: {line.fire_class}" if line.fire_class else "no fire class declared"
    )
    if line.price_basis != "catalogue":
        parts.append(f"price {line.price_basis}")
    return "; ".join(parts)


def _pack(line: BuyingLine, show: Quantities) -> str:
    return show.area(line.pack) if line.unit == "m2" else f"{line.pack:g}"


def _raw(buying: BuyingList, show: Quantities) -> Builder:
    builder = Builder()
    rows = [
        (
            "; ".join([line.goods, *line.notes]),
            line.need,
            line.buy,
            f"{100 * line.waste:.0f} %",
            "missing",
        )
        for line in buying.raw
    ]
    heads = ("goods", "needed", "buy", "waste", "price")
    builder.table(heads, rows, right=(3,), wide=(0, 1, 2), small=True)
    cuts = [
        (
            line.goods,
            f"{bar.count} × {show.cut(bar.stock)}",
            cut_words(bar, show),
            show.cut(bar.left),
        )
        for line in buying.raw
        if line.plan is not None
        for bar in line.plan.bars
    ]
    proven = all(line.plan.proven for line in buying.raw if line.plan is not None)
    caption = "How to cut the battens" + (" (proven to need the least stock)" if proven else "")
    return builder.table(
        ("battens", "bars", "cut into", "left of each"),
        cuts,
        right=(3,),
        wide=2,
        caption=caption,
        small=True,
    )


def cut_words(bar: Bar, show: Quantities) -> str:
    """``2 × 1200 mm, 3 × 560 mm``: the pieces of a bar, longest first."""
    counts = Counter(bar.pieces)
    return ", ".join(f"{count} × {show.cut(length)}" for length, count in counts.items())


def _fixings(buying: BuyingList) -> Builder:
    rows = [
        (
            f"{line.product} ({line.where})",
            str(line.panels),
            str(line.each),
            str(line.panels * line.each),
            str(line.retention) if line.retention else NONE,
            f"{line.kind}; {line.note}",
        )
        for line in buying.fixings
    ]
    heads = ("for", "panels", "each", "fixings", "second retention", "what")
    return Builder().table(heads, rows, right=(1, 2, 3, 4), wide=5, small=True)


def to_text(buying: BuyingList) -> str:
    """The list as plain text, one block per line, safe at any width."""
    show = Quantities(buying.units)
    out = [f"Shopping list: {_line(buying.name)}", f"Room: {_line(buying.room)}", ""]
    for line in buying.lines:
        pieces = "" if line.pieces is None else f"pieces {line.pieces}, "
        out.append(f"{line.number}. {_line(_described(line))}")
        out.append(
            f"   {f'panels {line.panels}, ' if line.panels else ''}{pieces}{line.packs} × pack of "
            f"{_pack(line, show)}, {show.area(line.area_m2)}, {show.small(line.thickness_mm)} thick, "
            f"{show.weight(line.weight_kg)}, {money(line.cost, buying.currency)}, "
            f"spare {line.spare_percent:.0f} %"
        )
    out += [
        "",
        f"Total: {money(buying.total, buying.currency)}{'' if buying.is_complete else ' (incomplete)'}",
    ]
    out.append(f"Covered: {show.area(buying.area_m2)}; weight: {show.weight(buying.weight_kg)}")
    for raw in buying.raw:
        out.append(
            f"Raw goods: {raw.goods}: {raw.buy} (needed: {raw.need}; waste {100 * raw.waste:.0f} %)"
        )
        for bar in raw.plan.bars if raw.plan is not None else ():
            out.append(f"   cut {bar.count} × {show.cut(bar.stock)} into {cut_words(bar, show)}")
    for fix in buying.fixings:
        out.append(
            f"Fixings: {_line(fix.product)} ({fix.where}): {fix.panels} × {fix.each}"
            f"{f' and {fix.retention} second retentions' if fix.retention else ''}; {fix.kind}; {fix.note}"
        )
    for title, entries in _remarks(buying):
        if entries:
            out += ["", f"{title}:", *(f"- {_line(entry)}" for entry in entries)]
    return "\n".join(out) + "\n"


def to_csv(buying: BuyingList) -> str:
    """The list as CSV; units stand in the headings, and no cell can run as a formula."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\r\n")
    for row in list_rows(buying):
        writer.writerow([harmless(cell) if isinstance(cell, str) else cell for cell in row])
    return stream.getvalue()


def list_rows(buying: BuyingList) -> list[list[Any]]:
    """The list as cells: numbers as numbers, None where there is no value."""
    show = Quantities(buying.units)
    feet = buying.units == "ft"
    area, small, weight = (10.763910417, 1 / 25.4, 1 / 0.45359237) if feet else (1.0, 1.0, 1.0)
    rows: list[list[Any]] = [
        [
            "kind", "no", "panels", "item", "where", "pieces", "packs", "per_pack",
            "area_ft2" if feet else "area_m2", "thickness_in" if feet else "thickness_mm",
            "weight_lb" if feet else "weight_kg", f"cost_{buying.currency}", "spare_percent",
            "price", "fire_class_declared", "note",
        ]
    ]  # fmt: skip

    def scaled(value: float | None, factor: float, digits: int) -> float | None:
        return None if value is None else round(value * factor, digits)

    for line in buying.lines:
        per_pack = line.pack * area if line.unit == "m2" else line.pack
        rows.append(
            [
                "product", line.number, line.panels, line.item, line.where, line.pieces, line.packs,
                round(per_pack, 3), scaled(line.area_m2, area, 3), scaled(line.thickness_mm, small, 3),
                scaled(line.weight_kg, weight, 2), scaled(line.cost, 1.0, 2),
                round(line.spare_percent, 1), line.price_basis, line.fire_class, "",
            ]
        )  # fmt: skip
    rows.append(
        [
            "total", None, "", "total" if buying.is_complete else "total, incomplete", "", None, None,
            None, scaled(buying.area_m2, area, 3), None, scaled(buying.weight_kg, weight, 2),
            scaled(buying.total, 1.0, 2), None, "", "", "",
        ]
    )  # fmt: skip
    blank = [None] * 4
    for raw in buying.raw:
        cuts = [
            f"cut {bar.count} × {show.cut(bar.stock)} into {cut_words(bar, show)}"
            for bar in (raw.plan.bars if raw.plan is not None else ())
        ]
        note = "; ".join([f"needed: {raw.need}", *cuts, *raw.notes])
        rows.append(["raw goods", None, "", raw.goods, raw.buy, None, raw.amount, *blank, None,
                     round(100 * raw.waste, 1), "missing", "", note])  # fmt: skip
    for fix in buying.fixings:
        retention = f"{fix.retention} second retentions; " if fix.retention else ""
        rows.append(["fixings", None, "", f"for {fix.product}", fix.where, fix.panels * fix.each, None,
                     *blank, None, None, "", "", f"{fix.each} per panel; {retention}{fix.kind}; {fix.note}"])  # fmt: skip
    for title, entries in _remarks(buying):
        rows += [[title.lower(), None, "", entry, *[None] * 12] for entry in entries]
    return rows


def to_xlsx(buying: BuyingList, *, timestamp: int = 0) -> bytes:
    """The list as a spreadsheet: numbers are numbers, texts are texts whatever they begin with.

    Raises
    ------
    MissingPartError
        XlsxWriter is not installed.
    """
    try:
        import xlsxwriter
    except ImportError as error:
        from planner.errors import MissingPartError

        raise MissingPartError(
            "A spreadsheet needs XlsxWriter. Install it with: pip install xlsxwriter – or ask for .csv"
        ) from error
    from datetime import UTC, datetime

    stream = io.BytesIO()
    options = {
        "in_memory": True,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
    }
    book = xlsxwriter.Workbook(stream, options)
    made = datetime.fromtimestamp(max(timestamp, 0), UTC).replace(tzinfo=None)
    book.set_properties({"title": _line(f"Shopping list: {buying.name}")[:200], "created": made})
    sheet = book.add_worksheet("Shopping list")
    head = book.add_format({"bold": True, "bottom": 1, "text_wrap": True, "valign": "top"})
    strong = book.add_format({"bold": True, "top": 1})
    wrap = book.add_format({"text_wrap": True, "valign": "top"})
    plain = book.add_format({"valign": "top"})
    rows = list_rows(buying)
    for n, row in enumerate(rows):
        for column, cell in enumerate(row):
            style = (
                head
                if n == 0
                else strong
                if row[0] == "total"
                else wrap
                if column in (3, 4, 15)
                else plain
            )
            _write(sheet, n, column, cell, style)
    for column, width in enumerate((11, 5, 10, 46, 24, 8, 8, 9, 10, 12, 11, 12, 10, 10, 14, 50)):
        sheet.set_column(column, column, width)
    sheet.freeze_panes(1, 0)
    sheet.set_landscape()
    sheet.fit_to_pages(1, 0)
    sheet.repeat_rows(0)
    sheet.set_footer("&Lpage &P of &N")
    book.close()
    return stream.getvalue()


def _write(sheet: Any, row: int, column: int, cell: Any, style: Any) -> None:
    if cell is None or cell == "":
        sheet.write_blank(row, column, None, style)
    elif isinstance(cell, str):
        sheet.write_string(row, column, _cell(cell), style)
    else:
        sheet.write_number(row, column, cell, style)


def harmless(text: str) -> str:
    """Text for a CSV cell: what a spreadsheet would run as a formula gets an apostrophe before it."""
    plain = _line(text)
    return f"'{plain}" if plain[:1] in LEADING and plain else plain


def _line(text: str) -> str:
    """Text on one line, without controls."""
    return "".join(c if c.isprintable() else " " for c in text).strip()


def _cell(text: str) -> str:
    return _line(text)[:32_000]


def _remarks(buying: BuyingList) -> Sequence[tuple[str, Sequence[str]]]:
    return (
        ("Not known or made up", buying.notes),
        ("Assumed", buying.assumptions),
        ("Take care", buying.cautions),
    )
