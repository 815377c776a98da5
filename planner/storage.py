"""Writing files so that a crash or a full disk never leaves half a file behind."""

from __future__ import annotations

import contextlib
import os
import tempfile
from pathlib import Path

from planner.errors import InputError


def write_atomically(path: str | Path, content: bytes | str) -> Path:
    """Write a whole file, or nothing: a temporary name in the same folder, then a rename.

    Parameters
    ----------
    path
        Where the file is to be; its folder is made when it does not exist.
    content
        Bytes, or text that is written as UTF-8.

    Returns
    -------
    path
        The path written.

    Raises
    ------
    InputError
        The folder or the file cannot be written. What stood there before is untouched.
    """
    target = Path(path)
    data = content.encode("utf-8") if isinstance(content, str) else content
    temporary: str | None = None
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        handle, temporary = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name}.")
        with os.fdopen(handle, "wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(temporary, _usual_mode(target))
        os.replace(temporary, target)
    except OSError as error:
        if temporary is not None:
            with contextlib.suppress(OSError):
                os.unlink(temporary)
        raise InputError(
            f"cannot be written ({error.strerror or error})",
            file=target,
            cure="Choose a folder you may write to, with room on the disk.",
        ) from error
    return target


def _usual_mode(target: Path) -> int:
    """Permissions of the file that is replaced, or those a new file would get."""
    if target.exists():
        return target.stat().st_mode & 0o777
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask
