"""Before building: ``check``, ``predict`` and ``modes``."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from planner.cli.options import AsJson, MeasuredPath, OptionPath, RoomPath
from planner.cli.output import number, print_json, say, seconds, table, warn, warn_all

if TYPE_CHECKING:
    from planner.predict.prediction import Prediction
    from planner.predict.proportions import Candidate
    from planner.project import Project

MODES_SHOWN = 60
"""Rows of the table of modes; JSON has all."""


def register(app: typer.Typer) -> None:
    """Add these commands."""
    app.command(epilog="Example: planner check net-loft/room.toml")(check)
    app.command(epilog="Example: planner predict net-loft --option net-loft/options/first.toml")(
        predict
    )
    app.command(epilog="Example: planner modes net-loft --up-to 120")(modes)


def check(room: RoomPath, as_json: AsJson = False) -> None:
    """Read a room file and print what was understood."""
    from planner.bands import OCTAVES, band_label
    from planner.project import open_project
    from planner.report.quantities import Quantities

    project = open_project(room)
    surfaces, shape = project.surfaces, project.geometry
    if as_json:
        print_json(project.summary())
        return
    length, width, height = project.room.dimensions
    say(f"{project.room.name}")
    show = Quantities(project.room.units)
    sides = " × ".join(show.length(side) for side in (length, width, height))
    say(f"{sides}, {project.room.described_state}")
    say(
        f"Volume {show.volume(shape.volume)}, surface {show.area(shape.surface_area)}, "
        f"mean free path {show.length(shape.mean_free_path)}"
    )
    rows = [
        [
            part.name,
            part.material,
            show.bare_area(area),
            *(f"{a:.2f}{'*' if flag else ''}" for a, flag in zip(alpha, assumed, strict=True)),
        ]
        for part, area, alpha, assumed in zip(
            surfaces.parts, surfaces.area, surfaces.alpha, surfaces.assumed, strict=True
        )
    ]
    labels = [band_label(hz) for hz in OCTAVES]
    say()
    table(
        ["part", "material", f"area ({show.area_unit})", *labels],
        rows,
        title="Absorption coefficient per octave (Hz), from tables; * assumed: no source gives it",
    )
    if surfaces.items:
        table(
            ["furnishing", "count", *labels],
            [
                [name, f"{count:g}", *(f"{a:.2f}" for a in area)]
                for name, count, area in zip(
                    surfaces.items, surfaces.item_count, surfaces.item_area, strict=True
                )
            ],
            title="Absorption area of one piece per octave (m²)",
        )
    if project.target is not None:
        say(f"Target: {project.target.description} ({project.target.citation}).")
    warn_all(project.warnings)


def predict(
    room: RoomPath,
    option: OptionPath = None,
    measured: MeasuredPath = None,
    simulate: Annotated[
        bool,
        typer.Option("--simulate", help="Add a geometrical simulation, as a second opinion."),
    ] = False,
    strict: Annotated[
        bool, typer.Option("--strict", help="Exit with 1 when the room misses its target.")
    ] = False,
    as_json: AsJson = False,
) -> None:
    """Predict the reverberation time per octave by each formula, against the target."""
    from planner.measure.measured import read_measured
    from planner.project import open_project

    project = open_project(room)
    prediction = project.predict(
        None if option is None else project.option(option),
        None if measured is None else read_measured(measured),
        simulate=simulate,
        progress=None if as_json else _progress,
    )
    if as_json:
        print_json(prediction.to_json())
    else:
        _show_prediction(project, prediction)
    if strict and prediction.misses_target:
        raise typer.Exit(1)


def _progress(done: float, seconds: float) -> None:
    rest = f"about {seconds:.0f} s left" if done < 1 else "done"
    warn(f"  simulation {100 * done:.0f}%, {rest}")


def _show_prediction(project: Project, prediction: Prediction) -> None:
    from planner.bands import OCTAVES, band_label
    from planner.report.quantities import Quantities

    rows = [[name.replace("_", " "), *map(seconds, t)] for name, t in prediction.methods.items()]
    low, high = prediction.interval_s
    rows.append([f"{prediction.formula}, 95 % from", *map(seconds, low)])
    rows.append(["                to", *map(seconds, high)])
    target = prediction.target
    if target is not None:
        rows.append(["target from", *map(seconds, target.low)])
        rows.append(["         to", *map(seconds, target.high)])
    labels = [band_label(hz) + ("*" if hz in prediction.assumed_hz else "") for hz in OCTAVES]
    say(project.room.name)
    show = Quantities(project.room.units)
    say(
        f"Volume {show.volume(prediction.volume_m3)}, surface {show.area(prediction.surface_m2)}, "
        f"Schroeder frequency {prediction.schroeder_hz:.0f} Hz"
    )
    say()
    table(
        ["", *labels],
        rows,
        title="Predicted reverberation time (s) per octave (Hz); * rests on assumed coefficients",
    )
    if target is not None:
        say(f"Target: {target.description} ({target.citation}).")
    for line in prediction.verdicts:
        say(line)
    warn_all((*project.warnings, *prediction.warnings))


def modes(
    room: RoomPath,
    up_to: Annotated[
        float, typer.Option("--up-to", metavar="HZ", min=20, max=1000, help="Highest frequency.")
    ] = 200.0,
    vary: Annotated[
        bool,
        typer.Option("--vary", help="Search nearby dimensions whose modes are spread better."),
    ] = False,
    within: Annotated[
        float,
        typer.Option("--within", metavar="M", min=0.05, max=5, help="How far, either way, in m."),
    ] = 0.5,
    length: Annotated[
        str | None, typer.Option("--length", metavar="FROM:TO", help="Site range, for --vary.")
    ] = None,
    width: Annotated[str | None, typer.Option("--width", metavar="FROM:TO")] = None,
    height: Annotated[str | None, typer.Option("--height", metavar="FROM:TO")] = None,
    as_json: AsJson = False,
) -> None:
    """List the room's modes: frequency, kind, spacing and decay."""
    from planner.project import open_project

    project = open_project(room)
    found = project.modes(up_to)
    candidates = []
    if vary or length or width or height:
        candidates = _varied(project, within, (length, width, height))
    if as_json:
        content = found.to_json()
        if candidates:
            content["varied"] = [candidate.to_json() for candidate in candidates]
        print_json(content)
        return
    say(
        f"{project.room.name}: {len(found.modes.hz)} modes up to {up_to:g} Hz; "
        f"Schroeder frequency {found.schroeder_hz:.0f} Hz"
    )
    say()
    gaps = [*found.modes.spacing, float("nan")]
    table(
        ["frequency (Hz)", "mode", "kind", "to the next (Hz)", "decay time (s)"],
        [
            [f"{hz:.1f}", label, kind, number(gap, 1), seconds(t)]
            for hz, label, kind, gap, t in list(
                zip(
                    found.modes.hz,
                    found.modes.labels,
                    found.modes.kinds,
                    gaps,
                    found.modes.t_s,
                    strict=True,
                )
            )[:MODES_SHOWN]
        ],
        title="Modes with rigid walls; decay estimated from the coefficients",
    )
    if len(found.modes.hz) > MODES_SHOWN:
        say(f"The first {MODES_SHOWN} are shown; --json gives all.")
    table(
        ["one-third octave (Hz)", *(f"{hz:g}" for hz in found.bands_hz)],
        [["modes", *(f"{n:.0f}" for n in found.count)]],
    )
    for criterion in found.criteria:
        verdict = "yes" if criterion.holds else "no "
        say(f"{verdict}  {criterion.name}: {criterion.numbers} [{criterion.source}]")
    if found.rating is not None:
        say(f"This room: {found.rating.reason}.")
    for candidate in candidates:
        say(
            "Better: {:.2f} × {:.2f} × {:.2f} m: ".format(*candidate.dimensions)
            + f"{candidate.reason}."
        )
    warn_all(found.warnings)


def _varied(
    project: Project, within: float, ranges: tuple[str | None, str | None, str | None]
) -> list[Candidate]:
    from planner.air import speed_of_sound
    from planner.errors import RoomError
    from planner.predict.proportions import search

    if not project.room.is_rectangle:
        raise RoomError(
            "dimensions can be varied for rectangular rooms only",
            where="[shape]",
            cure="Describe it by length, width and height.",
        )
    low, high = [], []
    for name, size, text in zip(
        ("length", "width", "height"), project.room.dimensions, ranges, strict=True
    ):
        first, last = (
            _range(name, text, project.room.units) if text else (size - within, size + within)
        )
        low.append(first)
        high.append(last)
    return search(
        (low[0], high[0]),
        (low[1], high[1]),
        (low[2], high[2]),
        speed_of_sound=float(speed_of_sound(project.air.temperature_c)),
    )


def _range(name: str, text: str, units: str) -> tuple[float, float]:
    from planner.errors import RoomError
    from planner.room.lengths import parse_length

    first, colon, last = text.partition(":")
    if not colon:
        raise RoomError(f"--{name} {text!r} is no range", cure=f"Write --{name} 4.2:5.0.")
    return parse_length(first, units), parse_length(last, units)
