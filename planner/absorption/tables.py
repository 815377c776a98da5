"""Reading tables as people save them: commas or semicolons, decimal commas, odd encodings."""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from planner.bands import OCTAVES
from planner.errors import InputError

LARGEST_FILE = 5_000_000
"""A table beyond this is something else. [byte]"""

_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d{1,2})?", re.IGNORECASE | re.ASCII)
_BAND = re.compile(r"a?\s*([\d.,]+)\s*(k?)\s*(?:hz)?", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Row:
    """One row of a table."""

    cells: dict[str, str]
    """By heading, stripped."""
    line: int
    """In the file, counted from 1."""
    decimal_comma: bool

    def text(self, column: str) -> str:
        """Cell of that column; empty where the table has no such column."""
        return self.cells.get(column, "")

    def number(self, column: str) -> float | None:
        """Number in that column, or None where the cell is empty.

        Raises
        ------
        ValueError
            The cell holds something else, or nothing finite.
        """
        cell = self.text(column)
        if not cell:
            return None
        plain = cell.replace(",", ".") if self.decimal_comma else cell
        if not _NUMBER.fullmatch(plain) or not math.isfinite(float(plain)):
            raise ValueError(f"{cell[:40]!r} under {column!r} is not a number")
        return float(plain)


def decoded(raw: bytes) -> str:
    """Text of a file saved as UTF-8 or UTF-16, with or without a mark, or by an older spreadsheet."""
    marked = raw[:2] in (b"\xff\xfe", b"\xfe\xff")
    for encoding in ("utf-16",) if marked else ("utf-8-sig", "cp1252"):
        try:
            return raw.decode(encoding)
        except UnicodeDecodeError:
            continue
    return raw.decode("latin-1")


def rows_of(text: str, *, whole: bool = False) -> list[Row]:
    """Rows of a table; lines that start with ``#`` are comments.

    The delimiter is the one of ``;``, tab and ``,`` that the heading line holds most of; with
    semicolons or tabs a comma inside a number is a decimal comma.

    Parameters
    ----------
    text
        Of the file.
    whole
        Refuse a row with more cells than there are headings: everything after a separator that should
        have been in quotation marks would sit in the wrong column. Else the surplus is dropped, which
        does no harm where only the last column holds free words.

    Raises
    ------
    csv.Error
        A heading stands there twice, or a row has too many cells.
    """
    lines = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    start = next((n for n, line in enumerate(lines) if not _is_remark(line)), None)
    if start is None:
        return []
    delimiter = max(";\t,", key=lines[start].count)
    reader = csv.reader(io.StringIO("\n".join(lines[start:])), delimiter=delimiter)
    headings = _headings(next(reader))
    found = []
    for cells in reader:
        if not any(cell.strip() for cell in cells) or cells[0].lstrip().startswith("#"):
            continue
        stripped = [cell.strip() for cell in cells]
        line = start + reader.line_num
        if whole and any(stripped[len(headings) :]):
            raise csv.Error(
                f"line {line} has {len(cells)} cells under {len(headings)} headings: "
                "put text that holds the separator in quotation marks"
            )
        row = dict(zip(headings, stripped, strict=False))
        found.append(Row(row, line, delimiter != ","))
    return found


def _is_remark(line: str) -> bool:
    """Empty, a comment (a spreadsheet may have put it in quotation marks), or the hint ``sep=;``."""
    bare = line.strip().strip(";,\t").lstrip('"')
    return not bare or bare.startswith("#") or bare.lower().startswith("sep=")


def _headings(cells: Sequence[str]) -> list[str]:
    names = [band_heading(cell) for cell in cells]
    while names and not names[-1]:
        names.pop()
    twice = next((name for name in names if name and names.count(name) > 1), None)
    if twice:
        raise csv.Error(f"the column {twice!r} stands there twice")
    return names


def read_table(
    path: Path, needed: Sequence[str], *, kind: type[InputError] = InputError
) -> list[Row]:
    """Rows of a file that must have certain columns.

    Raises
    ------
    InputError
        Of the `kind` given: the file cannot be read, or a column is missing.
    """
    try:
        raw = path.read_bytes()
    except OSError as error:
        raise kind(f"cannot be read ({error.strerror or error})", file=path) from error
    if len(raw) > LARGEST_FILE:
        raise kind(f"is {len(raw) / 1e6:.1f} MB large", file=path, cure="A table has a few kB.")
    try:
        rows = rows_of(decoded(raw), whole=True)
    except csv.Error as error:
        raise kind(f"is no table ({error})", file=path, cure="Save it as CSV.") from error
    if not rows:
        raise kind("holds no rows", file=path, cure=f"Columns: {', '.join(needed)}.")
    missing = [name for name in needed if name not in rows[0].cells]
    if missing:
        raise kind(
            f"has no column {missing[0]!r}", file=path, cure=f"Columns: {', '.join(needed)}."
        )
    return rows


def band_heading(cell: str) -> str:
    """A heading in lower case; ``125``, ``125 Hz``, ``1k`` and ``1,000`` become ``a125``, ``a1000``."""
    name = cell.strip().lower()
    match = _BAND.fullmatch(name)
    if match:
        digits = match[1].replace(",", "") if re.fullmatch(r"\d,\d{3}", match[1]) else match[1]
        try:
            hertz = float(digits.replace(",", ".")) * (1000 if match[2] else 1)
        except ValueError:
            return name
        if hertz in OCTAVES:
            return f"a{hertz:.0f}"
    return name
