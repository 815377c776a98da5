"""``demo`` and ``app``."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from planner.cli.options import AsJson
from planner.cli.output import print_json, say


def register(app: typer.Typer) -> None:
    """Add these commands."""
    app.command(epilog="Example: planner demo net-loft")(demo)
    app.command("app", epilog="Example: planner app net-loft")(open_app)


def demo(
    folder: Annotated[Path, typer.Argument(metavar="DIR", help="A new or empty folder.")],
    as_json: AsJson = False,
) -> None:
    """Write an invented project with recordings, and walk the whole loop on it."""
    from planner.cli.main import main
    from planner.demo import run_demo

    result = run_demo(folder, main, say=None if as_json else say)
    if as_json:
        print_json(result.to_json())
    if result.failed:
        raise typer.Exit(2)


def open_app(
    folder: Annotated[
        Path | None, typer.Argument(metavar="DIR", help="Project folder to open.")
    ] = None,
    port: Annotated[int, typer.Option("--port", min=1024, max=65535)] = 8501,
    no_browser: Annotated[
        bool, typer.Option("--no-browser", help="Do not open a browser window.")
    ] = False,
    lan: Annotated[
        bool,
        typer.Option("--lan", help="Let other computers in this network open it. Nobody logs in!"),
    ] = False,
) -> None:
    """Open the planner in a browser on this computer."""
    from planner.app.launch import launch

    raise typer.Exit(launch(folder, port=port, browser=not no_browser, lan=lan))
