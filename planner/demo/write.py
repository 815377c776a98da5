"""The files of the invented project, recordings included."""

from __future__ import annotations

import io
from collections.abc import Callable
from importlib.resources import files
from pathlib import Path

from planner.absorption.library import coefficients
from planner.demo.synthesis import RATE, Shell, recording, responses
from planner.errors import ProjectError
from planner.room.files import read_room
from planner.room.model import Room
from planner.room.surfaces import RoomSurfaces, room_library, room_surfaces
from planner.storage import write_atomically

TEXTS = {
    "room.toml": "room.toml",
    "catalogue.csv": "catalogue.csv",
    "survey.csv": "recordings/survey.csv",
}
"""Files that are written as they are, and where to."""

TRUE_ALPHA: dict[str, dict[int, float]] = {
    "plasterboard-on-studs": {
        63: 0.22, 125: 0.15, 250: 0.11, 500: 0.07, 1000: 0.06, 2000: 0.07, 4000: 0.08, 8000: 0.08,
    },
    "carpet-on-underlay": {
        63: 0.05, 125: 0.06, 250: 0.17, 500: 0.42, 1000: 0.58, 2000: 0.62, 4000: 0.64, 8000: 0.65,
    },
}  # fmt: skip
"""What these materials "really" absorb in the invented room: less bass than the tables say, because
the cavity is full of old packing, and a thinner carpet. Comparing then has something to find."""


def write_project(
    folder: str | Path, *, progress: Callable[[int, int], None] | None = None
) -> list[Path]:
    """Write the invented project into a new or empty folder.

    Parameters
    ----------
    folder
        Where to; an older demo in it is overwritten, anything else is not.
    progress
        Called with the number of recordings made and of all.

    Raises
    ------
    ProjectError
        The folder holds something else.
    """
    target = Path(folder)
    if target.exists() and not target.is_dir():
        raise ProjectError("is a file, not a folder", file=target, cure="Name a new folder.")
    if target.is_dir() and any(target.iterdir()) and not is_demo(target):
        raise ProjectError(
            "holds files already", file=target, cure="Name a new folder; nothing is overwritten."
        )
    shipped = files("planner.demo") / "files"
    written = [
        write_atomically(target / place, (shipped / name).read_text(encoding="utf-8"))
        for name, place in TEXTS.items()
    ]
    room = read_room(target)
    return [*written, *_recordings(room, target / "recordings", progress)]


def is_demo(folder: Path) -> bool:
    """Does the folder hold the invented project, as it was written."""
    try:
        shipped = (files("planner.demo") / "files" / "room.toml").read_text(encoding="utf-8")
        return (folder / "room.toml").read_text(encoding="utf-8") == shipped
    except OSError:
        return False


def _recordings(
    room: Room, folder: Path, progress: Callable[[int, int], None] | None
) -> list[Path]:
    import soundfile

    shell = true_shell(room)
    microphones = room.positions.microphones
    total = len(room.positions.sources) * len(microphones)
    written: list[Path] = []
    for number, (source, place) in enumerate(room.positions.sources.items()):
        heard = responses(shell, place, list(microphones.values()), seed=11 + number)
        for microphone, response in zip(microphones, heard, strict=True):
            pressure = recording(response, seed=100 + len(written))
            buffer = io.BytesIO()
            soundfile.write(buffer, pressure, RATE, format="FLAC", subtype="PCM_16")
            path = folder / f"{source}{microphone}.flac"
            written.append(write_atomically(path, buffer.getvalue()))
            if progress:
                progress(len(written), total)
    return written


def true_shell(room: Room) -> Shell:
    """The room with what its surfaces "really" absorb, averaged over each surface."""
    surfaces = true_surfaces(room)
    alpha = {}
    for name in room.surface_names:
        mine = [n for n, part in enumerate(surfaces.parts) if part.on == name]
        area = surfaces.area[mine]
        alpha[name] = (area @ surfaces.alpha[mine] / area.sum()).tolist()
    return Shell(room.dimensions, alpha, room.air_state())


def true_surfaces(room: Room) -> RoomSurfaces:
    """The surfaces of the invented room as they "really" are."""
    from dataclasses import replace

    from planner.bands import OCTAVES

    library = room_library(room)
    changed = [
        replace(library.find(name), alpha=tuple(values[hz] for hz in OCTAVES))
        for name, values in TRUE_ALPHA.items()
    ]
    for material in changed:
        coefficients(material)  # refuses what cannot be
    return room_surfaces(room, library.with_own(changed))
