"""At the seat: ``seat``."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from planner.cli.options import AsJson, OptionPath, RoomPath
from planner.cli.output import print_json, say, table, warn_all

if TYPE_CHECKING:
    from planner.predict.seat import Places, Seat

SHOWN = 16
"""Rows of the table of reflections; JSON has all."""


def register(app: typer.Typer) -> None:
    """Add this command."""
    app.command(epilog="Example: planner seat net-loft --search")(seat)


def seat(
    room: RoomPath,
    option: OptionPath = None,
    search: Annotated[
        bool, typer.Option("--search", help="Look for places with a flatter bass nearby.")
    ] = False,
    as_json: AsJson = False,
) -> None:
    """Show the bass at the seat, what makes its peaks and dips, and the first reflections."""
    from planner.project import open_project

    project = open_project(room)
    found = project.seat(None if option is None else project.option(option))
    places = project.better_places() if search else None
    if as_json:
        print_json({**found.to_json(), "search": None if places is None else places.to_json()})
        return
    say(project.room.name)
    say()
    _show_bass(found)
    _show_reflections(found)
    if places is not None:
        _show_places(places)
    warn_all(found.warnings)


def _show_bass(found: Seat) -> None:
    labels = found.modes.labels
    for one in found.responses:
        if one.name != "together" and len(found.responses) > 2:
            continue
        table(
            ["Hz", "level (dB)", "is a", "made by the modes"],
            [
                [
                    f"{extreme.hz:.0f}",
                    f"{extreme.level_db:.0f}",
                    "peak" if extreme.is_peak else "dip",
                    ", ".join(
                        "constant pressure" if labels[n] == "0 0 0" else labels[n]
                        for n in extreme.modes
                    ),
                ]
                for extreme in one.extremes
            ],
            title=f"Bass at the seat, {one.name}: {one.unevenness_db:.1f} dB uneven, from "
            f"{one.hz[0]:.0f} to {one.hz[-1]:.0f} Hz; levels against the free field at 1 m",
        )
    rows = [
        [one.name, interference.surface, f"{interference.hz:.0f}", f"{interference.excess:.2f}"]
        for one in found.responses
        for interference in one.interference[:3]
    ]
    if rows:
        table(
            ["loudspeaker", "surface", "first cancels at (Hz)", "longer way (m)"],
            rows,
            title="Boundary interference, the three lowest of each",
        )


def _show_reflections(found: Seat) -> None:
    table(
        ["loudspeaker", "by", "after (ms)", "level (dB)", "too strong"],
        [
            [
                name,
                " and ".join(one.surfaces),
                f"{1000 * one.delay:.1f}",
                f"{one.judged_db:.1f}",
                "yes" if one.is_early_and_strong else "",
            ]
            for name, one in found.reflections[:SHOWN]
        ],
        title="First reflections, 1 to 8 kHz against the direct sound",
    )
    table(
        ["surface", "from left (m)", "from below (m)", "width (m)", "height (m)"],
        [
            [area.surface, *(f"{v:.2f}" for v in (area.left, area.bottom, area.width, area.height))]
            for area in found.areas
        ],
        title="Where a panel would catch the strong first reflections, the head moving by 0.3 m",
    )


def _show_places(places: Places) -> None:
    left, right = places.loudspeakers
    say(
        f"Of {places.tried} arrangements nearby the flattest has {places.after_db:.1f} dB instead of "
        f"{places.before_db:.1f} dB:"
    )
    for name, spot in (("seat", places.seat), ("loudspeaker", left), ("loudspeaker", right)):
        say(f"  {name} at x {spot[0]:.2f}, y {spot[1]:.2f}, z {spot[2]:.2f} m")
