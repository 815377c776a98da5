"""A project as one zip file: to keep, to send, and to open again, whoever made it."""

from __future__ import annotations

import io
import zipfile
from pathlib import Path, PurePosixPath

from planner.errors import ProjectError
from planner.measure.measurement import SOUND
from planner.storage import write_atomically

MOST_FILES = 500
LARGEST_FILE = 400_000_000
LARGEST_ALL = 1_000_000_000
"""Of what comes out of an archive. [byte]"""
LARGEST_RATIO = 200
"""More than this is packed to burst, not to send."""

KEPT = (*SOUND, ".toml", ".csv", ".pdf", ".html", ".xlsx", ".txt", ".svg", ".dxf")
"""Endings that belong to a project."""


def packed(folder: Path, *, recordings: bool = True) -> bytes:
    """The files of a project as a zip, recordings included or not."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        for path in sorted(folder.rglob("*")):
            place = path.relative_to(folder)
            sound = place.parts[0] == "recordings" and path.suffix.lower() != ".csv"
            if path.is_symlink() or not path.is_file() or path.suffix.lower() not in KEPT:
                continue
            if sound and not recordings:
                continue
            # Sound hardly packs, and silence packs so well that it would be taken for a bomb.
            archive.write(
                path, place.as_posix(), zipfile.ZIP_STORED if sound else zipfile.ZIP_DEFLATED
            )
    return buffer.getvalue()


def unpack(content: bytes, folder: Path) -> list[Path]:
    """Put a zipped project into an empty folder.

    Raises
    ------
    ProjectError
        It is no zip, holds paths that leave the folder, or more than a project has; nothing is
        written then.
    """
    try:
        archive = zipfile.ZipFile(io.BytesIO(content))
        members = [one for one in archive.infolist() if not one.is_dir()]
    except (zipfile.BadZipFile, ValueError, OSError) as error:
        raise ProjectError("is no zip archive", cure="Choose a project downloaded here.") from error
    if len(members) > MOST_FILES:
        raise ProjectError(f"holds {len(members)} files, a project has up to {MOST_FILES}")
    names = [PurePosixPath(one.filename.replace("\\", "/")) for one in members]
    for one, name in zip(members, names, strict=True):
        if name.is_absolute() or ".." in name.parts or ":" in one.filename:
            raise ProjectError(
                f"holds the path {one.filename[:60]!r}, which leaves the project",
                cure="Do not open archives from someone you do not know.",
            )
        if (one.external_attr >> 16) & 0o170000 == 0o120000:
            raise ProjectError(
                f"holds a link ({one.filename[:60]!r})", cure="Pack the file itself."
            )
        if one.file_size > LARGEST_FILE or one.file_size > LARGEST_RATIO * max(
            one.compress_size, 1000
        ):
            raise ProjectError(
                f"{one.filename[:60]!r} claims {one.file_size / 1e6:.0f} MB when unpacked"
            )
    if sum(one.file_size for one in members) > LARGEST_ALL:
        raise ProjectError(f"holds more than {LARGEST_ALL / 1e6:.0f} MB")
    root = _root(names)
    if root is None:
        raise ProjectError("holds no room.toml", cure="Choose a project downloaded here.")
    written = []
    for one, name in zip(members, names, strict=True):
        inner = (
            name.relative_to(root) if root in name.parents or root == PurePosixPath(".") else None
        )
        if inner is None or name.suffix.lower() not in KEPT:
            continue
        try:
            with archive.open(one) as stream:
                data = stream.read(one.file_size + 1)
        except (zipfile.BadZipFile, RuntimeError, NotImplementedError, OSError, EOFError) as error:
            raise ProjectError(f"{one.filename[:60]!r} is damaged or encrypted") from error
        if len(data) > one.file_size:
            raise ProjectError(f"{one.filename[:60]!r} holds more than it claims")
        written.append(write_atomically(folder / Path(*inner.parts), data))
    return written


def _root(names: list[PurePosixPath]) -> PurePosixPath | None:
    """Folder inside the archive that holds the room file nearest to its top."""
    rooms = [name for name in names if name.name == "room.toml"]
    return min(rooms, key=lambda name: len(name.parts)).parent if rooms else None
