"""What the commands print: one JSON object, or tables for people; doubts go to standard error."""

from __future__ import annotations

import io
import json
import sys
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

import numpy as np

WIDTH = 100
"""Columns when the output goes to a file or a pipe."""


def plain(value: Any) -> Any:
    """Numbers, lists and text that JSON can hold; what is missing or not finite is ``None``."""
    if isinstance(value, Mapping):
        return {str(key): plain(entry) for key, entry in value.items()}
    if isinstance(value, np.ndarray):
        return plain(value.tolist())
    if isinstance(value, list | tuple | set | frozenset):
        return [plain(entry) for entry in value]
    if isinstance(value, np.generic):
        return plain(value.item())
    if isinstance(value, float) and not np.isfinite(value):
        return None
    return value


def print_json(content: Mapping[str, Any]) -> None:
    """One JSON object on standard output."""
    sys.stdout.write(json.dumps(plain(content), ensure_ascii=False, allow_nan=False) + "\n")


def say(text: str = "") -> None:
    """A line for people on standard output."""
    sys.stdout.write(text + "\n")


def warn(text: str) -> None:
    """A doubt or a refusal, on standard error."""
    sys.stderr.write(text + "\n")


def warn_all(texts: Iterable[str]) -> None:
    """Doubts, each on a line of its own."""
    for text in texts:
        warn(f"Note: {text}")


def table(headings: Sequence[str], rows: Iterable[Sequence[Any]], *, title: str = "") -> None:
    """A table on standard output; numbers stand to the right."""
    from rich import box
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    rows = [[_cell(value) for value in row] for row in rows]
    grid = Table(box=box.SIMPLE_HEAD, padding=(0, 1), pad_edge=False, show_edge=False)
    for number, heading in enumerate(headings):
        numeric = bool(rows) and all(_is_numeric(row[number]) for row in rows)
        grid.add_column(Text(heading), justify="right" if numeric else "left", overflow="fold")
    for row in rows:
        grid.add_row(*(Text(value) for value in row))
    width = None if sys.stdout.isatty() else WIDTH
    page = io.StringIO()
    Console(width=width, highlight=False, file=page, color_system=None).print(grid)
    lines = [title] if title else []
    lines += [line.rstrip() for line in page.getvalue().splitlines()]
    sys.stdout.write("\n".join(lines) + "\n\n")


def seconds(value: float | None) -> str:
    """A reverberation time for reading; an en dash where there is none."""
    if value is None or np.isnan(value):
        return "–"
    return "∞" if np.isinf(value) else f"{value:.2f}"


def number(value: float | None, digits: int = 2) -> str:
    """A number for reading; an en dash where there is none."""
    return "–" if value is None or not np.isfinite(value) else f"{value:.{digits}f}"


def _cell(value: Any) -> str:
    return "–" if value is None else str(value)


def _is_numeric(text: str) -> bool:
    stripped = text.strip("–∞+-−±% *")
    return not stripped or stripped.replace(".", "", 1).replace(",", "").isdigit()
