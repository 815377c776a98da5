"""On site: ``noise``, ``measure`` and ``compare``."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from planner.cli.options import AsJson, RoomPath
from planner.cli.output import number, print_json, say, seconds, table, warn, warn_all

if TYPE_CHECKING:
    from planner.measure.measured import Measured
    from planner.measure.measurement import Measurement
    from planner.reconcile.compare import Comparison
    from planner.reconcile.proof import Proof
    from planner.room.model import Room


def register(app: typer.Typer) -> None:
    """Add these commands."""
    app.command(epilog="Example: planner noise pink.wav --room net-loft")(noise)
    app.command(epilog="Example: planner measure net-loft/recordings -o net-loft/measured.csv")(
        measure
    )
    app.command(epilog="Example: planner compare net-loft net-loft/measured.csv")(compare)


def noise(
    out: Annotated[Path, typer.Argument(metavar="OUT.wav", help="WAV or FLAC, 24 bit.")],
    bursts: Annotated[int, typer.Option("--bursts", help="How many decays.")] = 4,
    burst: Annotated[
        float | None, typer.Option("--burst", metavar="S", help="Length of each burst.")
    ] = None,
    silence: Annotated[
        float | None, typer.Option("--silence", metavar="S", help="Silence after each.")
    ] = None,
    rate: Annotated[int, typer.Option("--rate", metavar="HZ")] = 48_000,
    seed: Annotated[int, typer.Option("--seed")] = 1,
    headroom: Annotated[
        float, typer.Option("--headroom", metavar="DB", help="Peak under full scale.")
    ] = 3.0,
    room: Annotated[
        Path | None, typer.Option("--room", metavar="ROOM", help="Fit the lengths to this room.")
    ] = None,
    as_json: AsJson = False,
) -> None:
    """Write the pink-noise test signal to play on site, and its cue sheet."""
    from planner.measure.noise import cue_sheet, lengths_for, noise_signal, write_signal
    from planner.storage import write_atomically

    name, volume, expected = "", None, None
    usual = (4.0, 4.0)
    if room is not None:
        import numpy as np

        from planner.project import open_project

        project = open_project(room)
        prediction = project.predict()
        name, volume, expected = project.room.name, prediction.volume_m3, prediction.time
        usual = lengths_for(float(np.max(np.where(np.isfinite(expected), expected, 0.0))))
    signal = noise_signal(
        bursts=bursts,
        burst_s=burst if burst is not None else usual[0],
        silence_s=silence if silence is not None else usual[1],
        rate_hz=rate,
        seed=seed,
        headroom_db=headroom,
    )
    path = write_signal(out, signal)
    sheet = cue_sheet(signal, file=path.name, room=name, volume=volume, expected_s=expected)
    sheet_path = write_atomically(path.with_suffix(".txt"), sheet)
    if as_json:
        print_json({**signal.to_json(), "file": str(path), "cue_sheet": str(sheet_path)})
        return
    say(sheet)
    say(f"Written: {path} and {sheet_path}")


def measure(
    files: Annotated[
        list[Path], typer.Argument(metavar="FILES…", help="Recordings, or folders of them.")
    ],
    output: Annotated[
        Path | None, typer.Option("--output", "-o", metavar="F", help="Write measured.csv.")
    ] = None,
    impulse: Annotated[
        bool, typer.Option("--impulse", help="They hold a clap, a balloon or an impulse response.")
    ] = False,
    thirds: Annotated[bool, typer.Option("--thirds", help="One-third octaves.")] = False,
    survey: Annotated[
        Path | None, typer.Option("--survey", metavar="F", help="survey.csv, if not beside them.")
    ] = None,
    room: Annotated[
        Path | None, typer.Option("--room", metavar="ROOM", help="Note down this room's air.")
    ] = None,
    state: Annotated[
        str, typer.Option("--state", help="empty, furnished or occupied; else from survey.csv.")
    ] = "",
    forward: Annotated[
        bool, typer.Option("--forward", help="Filters that run forwards, as a check.")
    ] = False,
    as_json: AsJson = False,
) -> None:
    """Find reverberation times in recordings of interrupted noise, or of impulses."""
    from dataclasses import replace

    from planner.errors import InputError
    from planner.measure.measured import STATES, write_measured
    from planner.measure.measurement import measure as measure_files

    if state not in STATES:
        raise InputError(f"--state {state!r} is no state", cure="Use empty, furnished or occupied.")
    described = None
    if room is not None:
        from planner.room.files import read_room

        described = read_room(room)
    result = measure_files(
        files,
        impulse=impulse,
        thirds=thirds,
        survey=survey,
        forward=forward,
        air=None if described is None else described.air_state(),
        state=state,
        progress=None if as_json else _progress,
    )
    measured = result.measured
    if described is not None:
        measured = replace(measured, warnings=(*measured.warnings, *_distances(described, result)))
    written = write_measured(output, measured) if output is not None else None
    if as_json:
        print_json({**measured.to_json(), "written": None if written is None else str(written)})
        return
    show_measured(measured)
    if written is not None:
        say(f"Written: {written}")


def _distances(room: Room, result: Measurement) -> list[str]:
    """Doubts about where source and microphones stood, where the room file says it."""
    import numpy as np

    from planner.measure.survey import distance_doubts
    from planner.room.geometry import geometry

    if not (room.positions.sources or room.positions.microphones):
        return []
    known = result.measured.t_s[np.isfinite(result.measured.t_s)]
    return distance_doubts(
        room.positions.sources,
        room.positions.microphones,
        [place.pair for place in result.places],
        volume=geometry(room).volume,
        reverberation_time=float(np.median(known)) if len(known) else 0.5,
    )


def _progress(done: int, total: int) -> None:
    if total > 1:
        warn(f"  {done} of {total} recordings evaluated")


def show_measured(measured: Measured) -> None:
    """Table of a measurement and everything that was found."""
    from planner.bands import band_label
    from planner.measure.figures import doubts_in_words

    rows = [
        [
            band_label(hz),
            seconds(measured.t_s[n]),
            "" if not measured.evaluation[n] else f"± {2 * measured.u_s[n]:.2f}",
            measured.evaluation[n] or "refused",
            seconds(measured.t20_s[n]),
            seconds(measured.t30_s[n]),
            seconds(measured.edt_s[n]),
            number(measured.range_db[n], 0),
            f"{measured.positions[n]}",
            f"{measured.decays[n]}",
        ]
        for n, hz in enumerate(measured.bands_hz)
    ]
    table(
        ["Hz", "T (s)", "95 %", "from", "T20", "T30", "EDT", "range (dB)", "positions", "decays"],
        rows,
        title="Measured reverberation time",
    )
    for words in doubts_in_words(measured.bands_hz, measured.flags):
        say(words)
    if measured.grade:
        say(f"Positions and decays reach the {measured.grade} method of ISO 3382-2.")
    for note in measured.recordings:
        for text in note.warnings:
            warn(f"{note.file}: {text}")
    warn_all(measured.warnings)


def compare(
    room: RoomPath,
    measured: Annotated[
        list[Path],
        typer.Argument(metavar="MEASURED.csv [AFTER.csv]", help="Before, and after treatment."),
    ],
    option: Annotated[
        Path | None,
        typer.Option("--option", metavar="F", help="The treatment in place (after, or alone)."),
    ] = None,
    confidence: Annotated[
        float, typer.Option("--confidence", min=0.5, max=0.99, help="Of the verdicts.")
    ] = 0.9,
    as_json: AsJson = False,
) -> None:
    """Compare predicted and measured, and say which coefficients explain the gap."""
    from planner.errors import InputError
    from planner.measure.measured import read_measured
    from planner.project import open_project

    project = open_project(room)
    tables = [read_measured(path) for path in measured[:2]]
    treatment = None if option is None else project.option(option)
    if len(measured) > 2:
        raise InputError(
            f"{len(measured)} measurements are too many", cure="Give one before and one after."
        )
    if len(tables) == 2:
        if treatment is None:
            raise InputError(
                "two measurements need the treatment between them",
                cure="Name it with --option options/NAME.toml.",
            )
        proof = project.prove(tables[0], tables[1], treatment, confidence)
        if as_json:
            print_json({**proof.after.to_json(), "proof": proof.to_json()})
        else:
            _show_proof(proof)
        return
    comparison = project.compare(tables[0], treatment)
    if as_json:
        print_json(comparison.to_json())
    else:
        _show_comparison(comparison)


def _show_comparison(comparison: Comparison) -> None:
    from planner.bands import band_label

    table(
        ["Hz", "predicted (s)", "± 2u", "measured (s)", "± 2u", "difference (s)", "%", "z"],
        [
            [
                band_label(hz) + ("*" if hz in comparison.assumed_hz else ""),
                seconds(comparison.predicted[n]),
                number(2 * comparison.predicted_u[n]),
                seconds(comparison.measured[n]),
                number(2 * comparison.measured_u[n]),
                _signed(comparison.difference_s[n], 2),
                _signed(comparison.difference_percent[n], 0),
                _signed(comparison.z[n], 1),
            ]
            for n, hz in enumerate(comparison.bands_hz)
        ],
        title=f"Predicted ({comparison.formula}) and measured reverberation time; "
        "* rests on assumed coefficients",
    )
    for line in comparison.words:
        say(line)
    if comparison.calibration is not None:
        say()
        for line in comparison.calibration.words:
            say(line)
    warn_all(comparison.warnings)


def _show_proof(proof: Proof) -> None:
    from planner.bands import OCTAVES, band_label

    low, high = proof.interval
    table(
        [
            "Hz",
            "before (s)",
            "after (s)",
            "from",
            "to",
            "shorter by",
            "predicted",
            "target",
            "verdict",
        ],
        [
            [
                band_label(hz),
                seconds(proof.before.measured[n]),
                seconds(proof.after.measured[n]),
                seconds(low[n]),
                seconds(high[n]),
                seconds(proof.measured_improvement[n]),
                seconds(proof.predicted_improvement[n]),
                f"{seconds(proof.low[n])} to {seconds(proof.high[n])}",
                proof.verdicts[n] or "–",
            ]
            for n, hz in enumerate(OCTAVES)
        ],
        title=f"Measured before and after; intervals of {proof.confidence:.0%}",
    )
    for line in proof.words:
        say(line)


def _signed(value: float, digits: int) -> str:
    text = number(value, digits)
    return f"+{text}" if text != "–" and value > 0 else text
