"""The whole loop on the invented project, each command as a person would type it."""

from __future__ import annotations

import shlex
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from planner.demo.write import write_project


@dataclass(frozen=True, slots=True)
class Step:
    """One command of the loop."""

    command: str
    code: int
    """Its exit code."""
    seconds: float
    """[s]"""


@dataclass(frozen=True, slots=True)
class DemoResult:
    """What the demo wrote and ran."""

    written: tuple[str, ...]
    steps: tuple[Step, ...]

    @property
    def failed(self) -> bool:
        """A command could not be carried out."""
        return any(step.code not in (0, 1) for step in self.steps)

    def to_json(self) -> dict[str, Any]:
        """What ``planner demo --json`` prints."""
        return {
            "written": list(self.written),
            "steps": [
                {"command": step.command, "exit_code": step.code, "seconds": round(step.seconds, 2)}
                for step in self.steps
            ],
        }


def commands(folder: str) -> list[list[str]]:
    """The loop: draw, predict, measure, reconcile, treat, buy, report."""
    option, measured = f"{folder}/options/first.toml", f"{folder}/measured.csv"
    return [
        ["check", folder],
        ["predict", folder],
        ["modes", folder, "--up-to", "100"],
        ["noise", f"{folder}/out/pink.wav", "--room", folder],
        ["measure", f"{folder}/recordings", "-o", measured, "--room", folder],
        ["compare", folder, measured],
        ["suggest", folder, "--measured", measured, "--confidence", "0.8", "-o", option],
        ["predict", folder, "--measured", measured, "--option", option],
        ["buy", folder, option, "-o", f"{folder}/out/list.pdf"],
        ["report", folder, "--option", option, "--measured", measured, "-o", f"{folder}/out/report.pdf"],
    ]  # fmt: skip


def run_demo(
    folder: str | Path,
    run: Callable[[Sequence[str]], int],
    *,
    say: Callable[[str], None] | None = None,
) -> DemoResult:
    """Write the invented project and walk the loop on it.

    Parameters
    ----------
    folder
        A new or empty folder.
    run
        Carries out the words of one command and gives its exit code.
    say
        Where the commands and their results are printed; None keeps quiet.

    Raises
    ------
    ProjectError
        The folder holds something else.
    """
    import contextlib
    import os

    place = str(folder)
    written = [str(path) for path in write_project(folder)]
    if say:
        say(f"An invented project is in {place}: nothing in it is real, no price and no room.")
    steps = []
    for words in commands(place):
        command = shlex.join(["planner", *words])
        if say:
            say(f"\n$ {command}")
        began = time.monotonic()
        if say:
            code = run(words)
        else:
            with open(os.devnull, "w") as nowhere, contextlib.redirect_stdout(nowhere):
                code = run(words)
        steps.append(Step(command, code, time.monotonic() - began))
    results = sorted(str(path) for path in Path(folder).rglob("*") if path.is_file())
    if say:
        say(f"\nDone. Look at {place}/out, or open it in a browser: planner app {place}")
    return DemoResult(tuple(dict.fromkeys([*written, *results])), tuple(steps))
