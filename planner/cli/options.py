"""Words that several commands take."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

RoomPath = Annotated[
    Path, typer.Argument(metavar="ROOM", help="room.toml, or the folder it lies in.")
]
AsJson = Annotated[
    bool, typer.Option("--json", help="Print one JSON object and nothing else on standard output.")
]
OptionPath = Annotated[
    Path | None, typer.Option("--option", metavar="F", help="A treatment: options/NAME.toml.")
]
MeasuredPath = Annotated[
    Path | None,
    typer.Option("--measured", metavar="F", help="measured.csv: calibrate the room with it first."),
]
