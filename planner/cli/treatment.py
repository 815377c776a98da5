"""Treating and buying: ``suggest``, ``buy`` and ``report``."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from planner.cli.options import AsJson, MeasuredPath, OptionPath, RoomPath
from planner.cli.output import number, print_json, say, seconds, table, warn, warn_all

if TYPE_CHECKING:
    from planner.report.quantities import Quantities
    from planner.treat.suggestion import Suggestion


def register(app: typer.Typer) -> None:
    """Add these commands."""
    app.command(epilog="Example: planner suggest net-loft -o net-loft/options/first.toml")(suggest)
    app.command(
        epilog="Example: planner buy net-loft net-loft/options/first.toml -o net-loft/out/list.pdf"
    )(buy)
    app.command(
        epilog="Example: planner report net-loft --option net-loft/options/first.toml -o report.pdf"
    )(report)


def suggest(
    room: RoomPath,
    measured: MeasuredPath = None,
    budget: Annotated[
        float | None, typer.Option("--budget", min=0, help="Instead of the room file's.")
    ] = None,
    confidence: Annotated[
        float | None,
        typer.Option(
            "--confidence",
            min=0.5,
            max=0.99,
            help="Meet the target with this probability, the coefficients being uncertain.",
        ),
    ] = None,
    output: Annotated[
        Path | None, typer.Option("--output", "-o", metavar="F", help="Write the option.")
    ] = None,
    time_limit: Annotated[
        float, typer.Option("--time-limit", metavar="S", min=0.5, max=600)
    ] = 10.0,
    simulate: Annotated[
        bool,
        typer.Option("--simulate", help="Also ask a geometrical simulation of the treated room."),
    ] = False,
    alternatives: Annotated[
        int,
        typer.Option("--alternatives", min=0, max=5, help="Also lists made of other products."),
    ] = 0,
    as_json: AsJson = False,
) -> None:
    """Find the cheapest treatment that meets the target in every band, and prove it."""
    from planner.measure.measured import read_measured
    from planner.project import open_project
    from planner.report.quantities import Quantities
    from planner.treat.option import write_option

    project = open_project(room)
    before = None if measured is None else read_measured(measured)
    name = output.stem if output is not None else "suggested"
    answer, placement = project.suggest(
        before,
        budget=budget,
        confidence=confidence,
        time_limit=time_limit,
        name=name,
        simulate=simulate,
    )
    others = project.alternatives(answer, before, alternatives) if alternatives else ()
    written = write_option(output, answer.option) if output is not None else None
    for number_, other in enumerate(others, 2):
        if output is not None:
            write_option(output.with_name(f"{output.stem}-{number_}{output.suffix}"), other.option)
    if as_json:
        print_json(
            {
                **answer.to_json(),
                "unplaced": [
                    {"surface": surface, "product": product, "amount": amount}
                    for (surface, product), amount in placement.unplaced.items()
                ],
                "alternatives": [other.to_json() for other in others],
                "written": None if written is None else str(written),
            }
        )
    else:
        shown = Quantities(project.room.units)
        _show(answer, shown)
        for other in others:
            say()
            say(f"Another list, {other.option.name}:")
            _show(other, shown, brief=True)
        warn_all(placement.warnings)
        if written is not None:
            say(f"Written: {written}")
    if answer.status == "infeasible":
        raise typer.Exit(1)


def _show(answer: Suggestion, show: Quantities, *, brief: bool = False) -> None:
    from planner.bands import OCTAVES, band_label

    table(
        ["product", "surface", "pieces", f"area ({show.area_unit})"],
        [
            [
                item.description,
                item.surface,
                "–" if item.count is None else f"{item.count}",
                show.bare_area(item.area_m2),
            ]
            for item in answer.items
        ],
        title="Treatment",
    )
    labels = [band_label(hz) + ("" if hz in answer.judged_hz else "*") for hz in OCTAVES]
    table(
        ["reverberation time (s)", *labels],
        [
            ["untreated", *map(seconds, answer.untreated)],
            ["treated, predicted", *map(seconds, answer.predicted)],
            ["target from", *map(seconds, answer.target_low)],
            ["         to", *map(seconds, answer.target_high)],
        ],
        title="" if brief else "* not judged: no limit, or it rests on assumed coefficients",
    )
    unit = "m² bought" if answer.currency == "m2" else answer.currency
    proof = (
        "proven cheapest" if answer.gap < 1e-6 else f"at most {answer.gap:.1%} above the cheapest"
    )
    say(f"Cost in whole packs: {number(answer.cost, 2)} {unit} ({answer.status}; {proof}).")
    say(f"Probability that every judged band lies inside: {answer.probability:.0%}.")
    if brief:
        return
    for band in answer.short_bands:
        say(
            f"{band.band_hz} Hz stays {band.side}: {band.reached_s:.2f} s, limit {band.limit_s:.2f} s; "
            f"{show.area(band.missing_m2)} of absorption missing, {show.area(band.largest_possible_m2)} "
            "can be had within the limits."
        )
    if answer.status == "infeasible":
        for limit in answer.binding:
            say(f"Used up: {show.sentence(limit)}.")
        for relaxation in answer.relaxations:
            say(f"It could be met: {show.sentence(relaxation.says)}")
    if answer.second_opinion is not None:
        says = answer.second_opinion.says.rstrip(".")
        say(f"{says[:1].upper()}{says[1:]}.")
    warn_all(answer.warnings)


def buy(
    room: RoomPath,
    option: Annotated[Path, typer.Argument(metavar="OPTION.toml", help="The treatment.")],
    output: Annotated[
        Path | None,
        typer.Option("--output", "-o", metavar="F", help="PDF, CSV, XLSX, HTML or TXT."),
    ] = None,
    paper: Annotated[str, typer.Option("--paper", help="a4, a3 or us-letter.")] = "a4",
    as_json: AsJson = False,
) -> None:
    """Print what to buy: packs, pieces, area, weight and cost, with the usual cautions."""
    from planner.handover import buying, shopping
    from planner.project import open_project

    project = open_project(room)
    treatment = project.option(option)
    bought = shopping(project, treatment)
    written = None
    if output is not None:
        from planner.report.printing import write_list

        written = write_list(
            output, buying(project, treatment), paper=paper, timestamp=int(option.stat().st_mtime)
        )
        if written.note:
            warn(written.note)
    if as_json:
        print_json({**bought.to_json(), "written": None if written is None else str(written.path)})
        return
    from planner.report.list_formats import to_text

    say(to_text(buying(project, treatment)))
    if written is not None:
        say(f"Written: {written.path}")


def report(
    room: RoomPath,
    option: OptionPath = None,
    measured: MeasuredPath = None,
    after: Annotated[
        Path | None,
        typer.Option("--after", metavar="F", help="measured.csv of the treated room: judge it."),
    ] = None,
    compare_with: Annotated[
        list[Path] | None,
        typer.Option("--compare", metavar="F", help="Another option to set beside it; repeat."),
    ] = None,
    output: Annotated[
        Path, typer.Option("--output", "-o", metavar="F", help="PDF or HTML.")
    ] = Path("report.pdf"),
    drawings: Annotated[
        Path | None,
        typer.Option("--drawings", metavar="F", help="Also the drawings alone: DXF, PDF, HTML."),
    ] = None,
    acceptance: Annotated[
        Path | None,
        typer.Option(
            "--acceptance", metavar="F", help="Also the acceptance sheet alone, with --after."
        ),
    ] = None,
    paper: Annotated[str, typer.Option("--paper", help="a4, a3 or us-letter.")] = "a4",
    as_json: AsJson = False,
) -> None:
    """Put everything on paper: one page for the client, then every number with its source."""
    from planner.errors import InputError
    from planner.handover import acceptance_sheet, report_data
    from planner.measure.measured import read_measured
    from planner.project import open_project
    from planner.report.printing import write_document, write_drawings
    from planner.report.report import report_document

    project = open_project(room)
    if acceptance is not None and after is None:
        raise InputError(
            "an acceptance sheet needs a measurement of the treated room",
            cure="Name it with --after after.csv.",
        )
    files = [project.room_file, project.folder / "catalogue.csv", option, measured, after]
    files += compare_with or []
    data = report_data(
        project,
        option=None if option is None else project.option(option),
        measured=None if measured is None else read_measured(measured),
        after=None if after is None else read_measured(after),
        others=[project.option(path) for path in compare_with or []],
        files=[path for path in files if path is not None and path.is_file()],
        paper=paper,
    )
    papers = [write_document(output, report_document(data))]
    if drawings is not None:
        papers.append(
            write_drawings(
                drawings,
                project.room,
                data.panels,
                paper=paper,
                units=data.units,
                timestamp=data.timestamp,
            )
        )
    if acceptance is not None:
        papers.append(write_document(acceptance, acceptance_sheet(data)))
    for one in papers:
        if one.note:
            warn(one.note)
    if as_json:
        print_json(
            {
                "written": str(papers[0].path),
                "also_written": [str(one.path) for one in papers[1:]],
            }
        )
    else:
        for one in papers:
            say(f"Written: {one.path}")
