"""A table that a person or a spreadsheet wrote: bytes to rows of cells that know their place."""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from difflib import get_close_matches

from planner.errors import CatalogueError

LARGEST_FILE = 2_000_000
"""A catalogue beyond this is something else. [byte]"""
MOST_PRODUCTS = 2_000
"""More rows than this are not weighed against each other."""

_DELIMITERS = ",;\t"


@dataclass(frozen=True, slots=True)
class Row:
    """Cells of one product by column, and where they stand."""

    cells: Mapping[str, str]
    number: int
    file: str
    decimal_comma: bool

    def wrong(self, column: str, what: str, cure: str | None = None) -> CatalogueError:
        """A refusal that names this row and the column."""
        name = self.cells.get("id", "")[:40]
        row = f"row {self.number} ({name})" if name else f"row {self.number}"
        return CatalogueError(what, file=self.file, where=f"{row}, column {column}", cure=cure)

    def text(self, column: str, longest: int = 300) -> str:
        """A cell as it stands, refused where no plain text."""
        value = self.cells.get(column, "")
        if len(value) > longest:
            raise self.wrong(column, f"holds {len(value)} characters", f"At most {longest}.")
        if any(ord(sign) < 32 for sign in value):
            raise self.wrong(column, "holds control characters", "Write plain text on one line.")
        return value

    def number_in(
        self, column: str, low: float, high: float, unit: str, hint: str = ""
    ) -> float | None:
        """A cell as a number between limits; None where it is empty."""
        text = self.cells.get(column, "")
        if not text:
            return None
        value = number_of(text, decimal_comma=self.decimal_comma)
        if value is None:
            raise self.wrong(
                column, f"{text[:40]!r} is not a number", "Write it like 12.50, without a unit."
            )
        if not low <= value <= high:
            cure = hint or f"It must lie from {low:g} to {high:g}."
            raise self.wrong(column, f"{text[:40]} {unit} cannot be".replace("  ", " "), cure)
        return value


def decoded(raw: bytes, file: str) -> str:
    """Text of a file in one of the encodings that spreadsheets write."""
    if len(raw) > LARGEST_FILE:
        raise CatalogueError(
            f"is {len(raw) / 1e6:.1f} MB large", file=file, cure="A catalogue has a few kB."
        )
    encodings = ("utf-16",) if raw[:2] in (b"\xff\xfe", b"\xfe\xff") else ("utf-8-sig", "cp1252")
    for encoding in encodings:
        try:
            text = raw.decode(encoding)
        except UnicodeDecodeError:
            continue
        if "\0" not in text:
            return text.replace("\r\n", "\n").replace("\r", "\n")
    raise CatalogueError(
        "is not a text file", file=file, cure="Save the table as CSV (UTF-8) and name that file."
    )


def rows_of(text: str, file: str, columns: Sequence[str]) -> list[Row]:
    """Rows of a table under known headings; separator and decimal sign are found out."""
    lines = text.split("\n")
    skipped = 0
    while skipped < len(lines) and (not lines[skipped].strip() or lines[skipped].startswith("#")):
        skipped += 1
    if skipped == len(lines):
        raise CatalogueError("is empty", file=file, cure="Its first row holds the headings.")
    delimiter = max(_DELIMITERS, key=lines[skipped].count)
    stream = io.StringIO("\n".join(lines[skipped:]))
    reader = csv.reader(stream, delimiter=delimiter, strict=True)
    rows: list[Row] = []
    try:
        headings = _headings(next(reader), file, columns)
        for cells in reader:
            number = reader.line_num + skipped
            if not any(cell.strip() for cell in cells):
                continue
            rows.append(_row(cells, headings, number, file, delimiter != ","))
            if len(rows) > MOST_PRODUCTS:
                raise CatalogueError(
                    f"holds more than {MOST_PRODUCTS} products",
                    file=file,
                    cure="Keep those you would really buy.",
                )
    except csv.Error as error:
        raise CatalogueError(
            f"is not a table: {error}",
            file=file,
            where=f"row {reader.line_num + skipped}",
            cure='Check the quotation marks ("…") in that row.',
        ) from error
    return rows


def _row(
    cells: list[str], headings: Sequence[str], number: int, file: str, decimal_comma: bool
) -> Row:
    if len(cells) > len(headings) and any(cell.strip() for cell in cells[len(headings) :]):
        raise CatalogueError(
            f"has {len(cells)} cells under {len(headings)} headings",
            file=file,
            where=f"row {number}",
            cure="Put text that holds the separator in quotation marks.",
        )
    pairs = zip(headings, (cell.strip() for cell in cells), strict=False)
    return Row(dict(pairs), number, file, decimal_comma)


def _headings(cells: Sequence[str], file: str, columns: Sequence[str]) -> tuple[str, ...]:
    names = tuple(cell.strip().lower().replace(" ", "_") for cell in cells)
    for name in names:
        if name not in columns:
            near = get_close_matches(name, columns, n=1, cutoff=0.6)
            raise CatalogueError(
                f"{name[:40]!r} is not a column the planner knows"
                if name
                else "a heading is empty",
                file=file,
                where="headings",
                cure=(f"Did you mean {near[0]!r}? " if near else "")
                + f"Known: {', '.join(columns)}. Remarks go under 'note'.",
            )
        if names.count(name) > 1:
            raise CatalogueError(
                f"the column {name!r} stands there twice", file=file, where="headings"
            )
    if "id" not in names:
        raise CatalogueError(
            "has no column 'id'", file=file, where="headings", cure=f"Known: {', '.join(columns)}."
        )
    return names


def number_of(text: str, *, decimal_comma: bool) -> float | None:
    """A plain decimal number, or None: no units, no thousands, nothing that is not finite."""
    if decimal_comma and text.count(",") == 1 and "." not in text:
        text = text.replace(",", ".")
    if not re.fullmatch(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d{1,2})?", text, re.ASCII):
        return None
    value = float(text)
    return value if math.isfinite(value) else None
