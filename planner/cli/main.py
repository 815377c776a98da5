"""The command ``planner``: its subcommands, and the one place where a refusal becomes words."""

from __future__ import annotations

import sys
from collections.abc import Sequence

import typer

from planner import __version__
from planner.cli import absorbers, browser, rooms, seat, site, treatment
from planner.cli.output import warn
from planner.errors import PlannerError

app = typer.Typer(
    name="planner",
    help=(
        "Predict, measure and treat the reverberation of small rooms for listening and speech.\n\n"
        "A room walks through the commands in this order: check, predict, modes, seat; noise, measure, "
        "compare; suggest, buy, report. Start with: planner demo net-loft"
    ),
    epilog="Example: planner predict net-loft/room.toml",
    no_args_is_help=True,
    add_completion=True,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,  # plain help answers in half the time
)

for group in (rooms, absorbers, seat, site, treatment, browser):
    group.register(app)


def _version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"room-treatment-planner {__version__}")
        raise typer.Exit


@app.callback()
def _planner(
    version: bool = typer.Option(
        False, "--version", help="Print the version.", callback=_version, is_eager=True
    ),
) -> None:
    pass


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command.

    Parameters
    ----------
    arguments
        Words after ``planner``; those of the process by default.

    Returns
    -------
    code
        0 done; 1 the answer is no; 2 bad input or usage.
    """
    try:
        app(args=None if arguments is None else list(arguments), prog_name="planner")
    except PlannerError as refusal:
        warn(f"Error: {refusal}")
        return 2
    except KeyboardInterrupt:
        warn("Stopped.")
        return 130
    except BrokenPipeError:
        sys.stderr.close()  # whoever read our output has gone; nothing is left to say
        return 0
    except SystemExit as end:
        return end.code if isinstance(end.code, int) else 2
    return 0
