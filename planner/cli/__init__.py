"""The commands: each parses its words, calls the package and prints what it gives.

Enters: what a person typed. Leaves: a table or one JSON object on standard output, doubts on
standard error, and an exit code: 0 done, 1 the answer is no, 2 bad input or usage.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence

from planner.cli.main import main

__all__ = ["main", "run"]


def run(arguments: Sequence[str] | None = None) -> None:
    """Entry point of the command ``planner``."""
    sys.exit(main(arguments))
