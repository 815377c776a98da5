"""Recordings of a project: taken into its folder, named by position, evaluated once."""

from __future__ import annotations

import csv
import hashlib
import io
import re
import tempfile
from collections import OrderedDict
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path, PurePosixPath
from typing import TYPE_CHECKING, Any

import streamlit as st

from planner.absorption.tables import decoded
from planner.app.work import SURVEY, Work
from planner.errors import PlannerError, RecordingError
from planner.measure.measurement import SOUND, measure
from planner.measure.sound_file import SoundFile
from planner.measure.survey import COLUMNS, Place, place_by_name, read_survey
from planner.storage import write_atomically

if TYPE_CHECKING:
    from planner.measure.measurement import Measurement

LONGEST_NAME = 80
MOST_KEPT = 4
"""Evaluations, with their curves, that the server remembers."""


def safe_name(name: str) -> str:
    """The name of an uploaded file without any path, and without what file systems forbid."""
    last = PurePosixPath(name.replace("\\", "/")).name
    stem, dot, ending = last.rpartition(".")
    plain = re.sub(r"[^\w\- ()+]+", "_", stem, flags=re.UNICODE).strip("_ ") or "recording"
    return f"{plain[:LONGEST_NAME]}{dot}{ending.lower()}"


def take(work: Work, name: str, content: bytes) -> str:
    """Put an upload into the project, and say in words what became of it.

    Parameters
    ----------
    work
        The open project.
    name
        Of the upload.
    content
        Its bytes; a sound file, or ``survey.csv``.

    Returns
    -------
    note
        Empty where there is nothing to say.

    Raises
    ------
    RecordingError
        It is no sound file, or no survey; nothing is kept of it then.
    """
    folder = work.folder / "recordings"
    if name.lower().endswith(".csv"):
        _check(content)
        work.save(SURVEY, decoded(content))
        return f"{name} says now which position each recording is."
    kept = safe_name(name)
    if Path(kept).suffix not in SOUND:
        raise RecordingError(
            "is no kind of sound file the planner reads",
            file=name,
            cure=f"Use {', '.join(SOUND[:4])} …",
        )
    path, number = folder / kept, 1
    while path.exists() and path.read_bytes() != content:
        # Letters: a further number would be taken for the name of a position.
        path = (
            folder
            / f"{Path(kept).stem}-{'abcdefghijklmnopqrstuvwxyz'[number % 26] * (1 + number // 26)}{Path(kept).suffix}"
        )
        number += 1
    if path.exists():
        return f"{name} was here already."
    write_atomically(path, content)
    try:
        with SoundFile(path) as file:
            notes = [str(note) for note in file.notes]
    except PlannerError:
        path.unlink(missing_ok=True)
        raise
    renamed = [] if path.name == name else [f"kept as {path.name}"]
    return f"{name}: {' '.join([*renamed, *notes])}" if renamed or notes else ""


def places(work: Work, files: Sequence[str]) -> dict[str, Place]:
    """Which position each file is: what survey.csv says, else what the file's name says.

    Raises
    ------
    RecordingError
        survey.csv cannot be used.
    """
    table = read_survey(work.folder / SURVEY) if (work.folder / SURVEY).is_file() else {}
    return {name: table.get(name) or place_by_name(name) for name in files}


def survey_text(rows: Sequence[Mapping[str, Any]]) -> str:
    """The edited positions as a survey file.

    Raises
    ------
    RecordingError
        A position is empty, or a word is not known.
    """
    out = io.StringIO()
    writer = csv.DictWriter(out, COLUMNS, lineterminator="\n", extrasaction="ignore")
    writer.writeheader()
    writer.writerows({name: row.get(name) or "" for name in COLUMNS} for row in rows)
    _check(out.getvalue().encode())
    return out.getvalue()


def _check(content: bytes) -> None:
    """Refuse a survey that cannot be used."""
    with tempfile.TemporaryDirectory() as place:
        try:
            read_survey(write_atomically(Path(place) / "survey.csv", content))
        except RecordingError as error:
            raise RecordingError(
                error.what, file="survey.csv", where=error.where, cure=error.cure
            ) from error


def evaluated(
    work: Work,
    files: Sequence[Path],
    *,
    impulse: bool,
    thirds: bool,
    state: str,
    progress: Callable[[int, int], None],
) -> Measurement:
    """What the recordings give; the same files are not evaluated twice.

    Raises
    ------
    RecordingError
        Nothing can be read from them.
    """
    air = work.room.air_state()
    digest = hashlib.sha256(repr((impulse, thirds, state, air)).encode())
    for path in [*files, work.folder / SURVEY]:
        if path.is_file():
            digest.update(path.name.encode())
            with path.open("rb") as stream:
                digest.update(hashlib.file_digest(stream, "sha256").digest())
    kept, key = _kept(), digest.hexdigest()
    if key not in kept:
        kept[key] = measure(
            files, impulse=impulse, thirds=thirds, air=air, state=state, progress=progress
        )
        while len(kept) > MOST_KEPT:
            kept.popitem(last=False)
    return kept[key]


@st.cache_resource(show_spinner=False)
def _kept() -> OrderedDict[str, Measurement]:
    """Evaluations by the content of their files; curves only, no sound."""
    return OrderedDict()
