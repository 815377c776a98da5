"""The README's output blocks: run them, compare them, or write them anew.

``python tests/readme.py`` rewrites the blocks from what the commands print now.
"""

from __future__ import annotations

import contextlib
import io
import os
import re
import shlex
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

README = Path(__file__).resolve().parents[1] / "README.md"
BLOCK = re.compile(r"```console\n\$ (planner [^\n]*)\n(.*?)```", re.DOTALL)


def blocks() -> list[tuple[str, str]]:
    """Each command of the README with the output it shows."""
    return [(match[1], match[2]) for match in BLOCK.finditer(README.read_text(encoding="utf-8"))]


@contextlib.contextmanager
def inside(folder: Path) -> Iterator[None]:
    """Run as if started in `folder`."""
    before = Path.cwd()
    os.chdir(folder)
    try:
        yield
    finally:
        os.chdir(before)


def output_of(command: str) -> str:
    """Standard output of a command, run in this process."""
    from planner.cli import main

    page = io.StringIO()
    with contextlib.redirect_stdout(page), contextlib.redirect_stderr(io.StringIO()):
        main(shlex.split(command)[1:])
    return page.getvalue().strip("\n") + "\n"


def prepare(folder: Path) -> None:
    """The demo project in `folder`, as the README's first command leaves it."""
    from planner.cli import main

    with (
        inside(folder),
        contextlib.redirect_stdout(io.StringIO()),
        contextlib.redirect_stderr(io.StringIO()),
    ):
        if main(["demo", "net-loft"]):
            raise SystemExit("the demo failed")


def rewrite() -> None:
    """Put what the commands print now into the README."""
    with tempfile.TemporaryDirectory() as name:
        prepare(Path(name))
        with inside(Path(name)):
            text = BLOCK.sub(
                lambda match: f"```console\n$ {match[1]}\n{output_of(match[1])}```",
                README.read_text(encoding="utf-8"),
            )
    README.write_text(text, encoding="utf-8")


if __name__ == "__main__":
    sys.path.insert(0, str(README.parent))
    rewrite()
