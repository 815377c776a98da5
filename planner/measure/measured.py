"""What was measured in a room, and its file ``measured.csv``."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner import __version__
from planner.absorption.tables import decoded, rows_of
from planner.air import Air
from planner.errors import MeasuredError
from planner.storage import write_atomically

Array = NDArray[np.float64]

COLUMNS = (
    "band_hz", "t_s", "u_s", "evaluation", "t20_s", "t30_s", "edt_s", "range_db", "positions",
    "decays", "flags",
)  # fmt: skip

EVALUATIONS = ("", "t15", "t20", "t30", "whole-decay")
STATES = ("", "empty", "furnished", "occupied")
LARGEST_FILE = 2_000_000
"""A table of results beyond this is something else. [byte]"""
LONGEST = 60.0
"""No room of this trade rings longer. [s]"""


@dataclass(frozen=True, slots=True)
class RecordingNote:
    """What one file gave."""

    file: str
    stops_s: tuple[float, ...]
    """Where its noise stops, of the decays that were used. [s]"""
    warnings: tuple[str, ...]
    """What was found, dropped or doubted, with the cure."""


@dataclass(frozen=True, slots=True)
class Measured:
    """Reverberation times of a room; NaN where a band was refused."""

    bands_hz: tuple[float, ...]
    """Nominal midbands, octaves or one-third octaves. [Hz]"""
    t_s: Array
    """The value to use, shape ``(band,)``. [s]"""
    u_s: Array
    """Its standard uncertainty. [s]"""
    evaluation: tuple[str, ...]
    """Which evaluation it is, empty where the band was refused."""
    t20_s: Array
    t30_s: Array
    edt_s: Array
    range_db: Array
    """Steady level over the noise floor. [dB]"""
    positions: tuple[int, ...]
    """Pairs of source and microphone position behind the value."""
    decays: tuple[int, ...]
    """Decays behind the value, all positions together."""
    flags: tuple[tuple[str, ...], ...]
    """Doubts per band, in words."""
    state: str = ""
    """``empty``, ``furnished``, ``occupied`` or unknown."""
    air: Air | None = None
    date: str = ""
    program: str = field(default_factory=lambda: f"room-treatment-planner {__version__}")
    recordings: tuple[RecordingNote, ...] = ()
    warnings: tuple[str, ...] = ()
    """About the measurement as a whole: grade, positions, how many more decays."""
    grade: str = ""
    """Method of ISO 3382-2 that the positions and decays reach."""

    def to_json(self) -> dict[str, Any]:
        """What ``planner measure --json`` prints; a missing value is None."""
        return {
            "bands_hz": [_plain(hz) for hz in self.bands_hz],
            "t_s": _listed(self.t_s),
            "used": [name or None for name in self.evaluation],
            "u_s": _listed(self.u_s),
            "t20_s": _listed(self.t20_s),
            "t30_s": _listed(self.t30_s),
            "edt_s": _listed(self.edt_s),
            "range_db": _listed(self.range_db),
            "flags": [list(words) for words in self.flags],
            "positions": list(self.positions),
            "decays": list(self.decays),
            "state": self.state or None,
            "grade": self.grade or None,
            "recordings": [
                {"file": note.file, "stops_s": list(note.stops_s), "warnings": list(note.warnings)}
                for note in self.recordings
            ],
            "warnings": list(self.warnings),
        }


def _plain(hertz: float) -> float | int:
    return int(hertz) if float(hertz).is_integer() else hertz


def _listed(values: Array) -> list[float | None]:
    return [float(value) if np.isfinite(value) else None for value in values]


def measured_to_csv(measured: Measured) -> str:
    """Text of ``measured.csv``: comment lines with the circumstances, then a row per band."""
    out = io.StringIO()
    out.write("# Reverberation times by interrupted noise or impulses; times in s, levels in dB\n")
    header: dict[str, object] = {
        "state": measured.state or "unknown",
        "date": measured.date,
        "program": measured.program,
        "grade": measured.grade,
    }
    if measured.air is not None:
        header |= {
            "temperature_c": f"{measured.air.temperature_c:g}",
            "humidity_percent": f"{measured.air.humidity_percent:g}",
            "pressure_kpa": f"{measured.air.pressure_kpa:g}",
        }
    for key, value in header.items():
        if value:
            out.write(f"# {key}: {' '.join(str(value).split())}\n")
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(COLUMNS)
    for n, hz in enumerate(measured.bands_hz):
        writer.writerow(
            [
                f"{hz:g}",
                *(_cell(values[n], 4) for values in (measured.t_s, measured.u_s)),
                measured.evaluation[n],
                *(_cell(v[n], 4) for v in (measured.t20_s, measured.t30_s, measured.edt_s)),
                _cell(measured.range_db[n], 1),
                measured.positions[n],
                measured.decays[n],
                "; ".join(measured.flags[n]),
            ]
        )
    return out.getvalue()


def write_measured(path: str | Path, measured: Measured) -> Path:
    """Write ``measured.csv`` atomically.

    Raises
    ------
    InputError
        The place cannot be written to.
    """
    return write_atomically(path, measured_to_csv(measured))


def read_measured(path: str | Path) -> Measured:
    """Read ``measured.csv``, from this program, a spreadsheet or a person.

    Only ``band_hz`` and ``t_s`` are needed; an empty ``t_s`` is a band that was refused.

    Raises
    ------
    MeasuredError
        The file cannot be read or a cell cannot be right; with line, column and cure.
    """
    file = Path(path)
    try:
        raw = file.read_bytes()
    except OSError as error:
        raise MeasuredError(
            f"cannot be read ({error.strerror or error})",
            file=file,
            cure="Name a measured.csv that `planner measure -o` wrote.",
        ) from error
    return measured_from_bytes(raw, file.name)


def measured_from_bytes(raw: bytes, file: str) -> Measured:
    """`Measured` from the content of a file; `file` is the name that refusals print.

    Raises
    ------
    MeasuredError
        As `read_measured`.
    """
    if len(raw) > LARGEST_FILE:
        raise MeasuredError(f"is {len(raw) / 1e6:.1f} MB large", file=file)
    text = decoded(raw)
    try:
        rows = rows_of(text)
    except csv.Error as error:
        raise MeasuredError(f"is no table ({error})", file=file) from error
    if not rows:
        raise MeasuredError(
            "holds no bands", file=file, cure="It needs the columns band_hz and t_s."
        )
    for name in ("band_hz", "t_s"):
        if name not in rows[0].cells:
            raise MeasuredError(
                f"has no column {name!r}", file=file, cure=f"Columns: {', '.join(COLUMNS)}."
            )
    table = [_Cells(row.cells, row.line, row.decimal_comma, file) for row in rows]
    bands = [cells.needed("band_hz", 20.0, 20_000.0, "Hz") for cells in table]
    for cells, one, following in zip(table[1:], bands, bands[1:], strict=False):
        if following <= one:
            raise cells.wrong(
                "band_hz", f"{following:g} Hz comes after {one:g} Hz", "Sort the bands."
            )
    header = _header(text)
    return Measured(
        bands_hz=tuple(bands),
        t_s=np.array([cells.number("t_s", 0.01, LONGEST, "s") for cells in table]),
        u_s=np.array([cells.number("u_s", 0.0, LONGEST, "s") for cells in table]),
        evaluation=tuple(cells.word("evaluation", EVALUATIONS) for cells in table),
        t20_s=np.array([cells.number("t20_s", 0.0, LONGEST, "s") for cells in table]),
        t30_s=np.array([cells.number("t30_s", 0.0, LONGEST, "s") for cells in table]),
        edt_s=np.array([cells.number("edt_s", 0.0, LONGEST, "s") for cells in table]),
        range_db=np.array([cells.number("range_db", -200.0, 300.0, "dB") for cells in table]),
        positions=tuple(cells.count("positions") for cells in table),
        decays=tuple(cells.count("decays") for cells in table),
        flags=tuple(cells.flags() for cells in table),
        state=_state(header.get("state", ""), file),
        air=_air(header, file),
        date=header.get("date", ""),
        program=header.get("program", ""),
        grade=header.get("grade", ""),
    )


@dataclass(frozen=True, slots=True)
class _Cells:
    cells: Mapping[str, str]
    line: int
    decimal_comma: bool
    file: str

    def wrong(self, column: str, what: str, cure: str | None = None) -> MeasuredError:
        place = f"line {self.line}, column {column}"
        return MeasuredError(what, file=self.file, where=place, cure=cure)

    def number(self, column: str, low: float, high: float, unit: str) -> float:
        cell = self.cells.get(column, "")
        if cell in ("", "–", "-"):
            return math.nan
        try:
            value = float(cell.replace(",", ".") if self.decimal_comma else cell)
        except ValueError:
            value = math.nan
        if math.isnan(value):
            raise self.wrong(column, f"{cell[:40]!r} is not a number", "Leave it empty if unknown.")
        if not low <= value <= high:
            cure = f"It must lie from {low:g} to {high:g} {unit}."
            if column == "t_s" and value > high:
                cure += f" Were milliseconds meant? Then write {value / 1000:g}."
            raise self.wrong(column, f"{value:g} {unit} cannot be", cure)
        return value

    def needed(self, column: str, low: float, high: float, unit: str) -> float:
        value = self.number(column, low, high, unit)
        if math.isnan(value):
            raise self.wrong(column, "is empty", "Every row needs it.")
        return value

    def count(self, column: str) -> int:
        value = self.number(column, 0.0, 1e6, "")
        return 0 if math.isnan(value) else round(value)

    def word(self, column: str, known: Sequence[str]) -> str:
        cell = self.cells.get(column, "").lower()
        if cell not in known:
            choices = ", ".join(word for word in known if word)
            raise self.wrong(column, f"{cell[:40]!r} is no evaluation", f"Use {choices}.")
        return cell

    def flags(self) -> tuple[str, ...]:
        return tuple(
            part.strip() for part in self.cells.get("flags", "").split(";") if part.strip()
        )


def _header(text: str) -> dict[str, str]:
    """``# key: value`` lines at the top; a spreadsheet may have wrapped them in quotes."""
    found = {}
    for line in text.splitlines():
        stripped = line.strip().strip('";,\t').strip()
        if not stripped.startswith("#"):
            break
        key, colon, value = stripped.lstrip("# ").partition(":")
        if colon:
            found[key.strip().lower()] = value.strip()
    return found


def _state(value: str, file: str) -> str:
    word = value.lower()
    if word == "unknown":
        return ""
    if word not in STATES:
        raise MeasuredError(
            f"{value[:40]!r} is no state of a room",
            file=file,
            where="# state",
            cure="Use empty, furnished or occupied.",
        )
    return word


def _air(header: Mapping[str, str], file: str) -> Air | None:
    if "temperature_c" not in header:
        return None
    try:
        values = [
            float(header.get(key, default).replace(",", "."))
            for key, default in (
                ("temperature_c", "20"),
                ("humidity_percent", "50"),
                ("pressure_kpa", "101.325"),
            )
        ]
    except ValueError as error:
        raise MeasuredError(str(error), file=file, where="# temperature_c …") from error
    if not (-20 <= values[0] <= 50 and 0 <= values[1] <= 100 and 50 <= values[2] <= 120):
        raise MeasuredError(
            f"air of {values[0]:g} °C, {values[1]:g} % and {values[2]:g} kPa cannot be",
            file=file,
            where="# temperature_c …",
        )
    return Air(*values)


def _cell(value: float, digits: int) -> str:
    return f"{value:.{digits}f}" if np.isfinite(value) else ""
