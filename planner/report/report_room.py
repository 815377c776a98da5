"""Sections on the room: its sizes, surfaces, air, and what had to be assumed."""

from __future__ import annotations

from typing import Any

from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.report.document import Builder, Section
from planner.report.quantities import Quantities
from planner.report.report_data import ReportData, band_heads
from planner.room.geometry import geometry


def room_sections(data: ReportData) -> list[Section]:
    """The room as it was described."""
    room, show = data.room, Quantities(data.units)
    shape = geometry(room)
    length, width, height = room.dimensions
    facts = [
        ("Length, width, height", " × ".join(show.length(v) for v in (length, width, height))),
        ("Volume", show.volume(shape.volume)),
        ("Surface of floor, ceiling and walls", show.area(shape.surface_area)),
        ("Mean free path", show.length(shape.mean_free_path)),
        ("State described", room.described_state),
        (
            "Air",
            f"{show.temperature(room.air.temperature_c)}, {room.air.humidity_percent:g} % humidity, "
            f"{room.air.pressure_kpa:g} kPa",
        ),
    ]
    if not room.is_rectangle:
        corners = "; ".join(f"({show.length(x)}, {show.length(y)})" for x, y in room.footprint)
        facts.append(("Corners of the footprint", corners))
    if room.positions.seat is not None:
        facts.append(
            ("Seat (x, y, ear height)", ", ".join(show.length(v) for v in room.positions.seat))
        )
    for n, place in enumerate(room.positions.loudspeakers, 1):
        facts.append((f"Loudspeaker {n} (x, y, height)", ", ".join(show.length(v) for v in place)))
    builder = Builder().table(("what", "value"), facts, wide=1)
    builder.words(
        "Lengths run from the front wall (x), from the left wall (y) and from the floor (z)."
    )
    _surfaces(builder, data, show)
    return builder.section("The room", new_page=True)


def _surfaces(builder: Builder, data: ReportData, show: Quantities) -> None:
    if data.surfaces is None:
        return
    surfaces = data.surfaces
    rows = []
    for n, part in enumerate(surfaces.parts):
        material = data.materials.get(part.material)
        words = material.description if material is not None else part.material
        rows.append(
            (
                part.name,
                words,
                show.area(float(surfaces.area[n])),
                *_alphas(surfaces.alpha[n], surfaces.assumed[n]),
            )
        )
    heads = ("surface", "material", "area", *band_heads())
    builder.table(heads, rows, right=tuple(range(2, 11)), wide=1, small=True,
                  caption="Surfaces with their absorption coefficients; (0.00) is assumed")  # fmt: skip
    items = [
        (
            name,
            f"{surfaces.item_count[n]:g}",
            *_areas(surfaces.item_area[n], surfaces.item_assumed[n], show),
        )
        for n, name in enumerate(surfaces.items)
    ]
    unit = show.area_unit
    builder.table(("furnishing", "count", *band_heads()), items, right=tuple(range(1, 10)), wide=0,
                  small=True, caption=f"Absorption area of one piece ({unit})")  # fmt: skip


def _alphas(values: NDArray[Any], assumed: NDArray[Any]) -> list[str]:
    return [f"({v:.2f})" if flag else f"{v:.2f}" for v, flag in zip(values, assumed, strict=True)]


def _areas(values: NDArray[Any], assumed: NDArray[Any], show: Quantities) -> list[str]:
    shown = [show.area(float(value)).split(" ")[0] for value in values]
    return [f"({text})" if flag else text for text, flag in zip(shown, assumed, strict=True)]


def assumption_sections(data: ReportData) -> list[Section]:
    """What had to be assumed, and every doubt the planner has about the input."""
    said = []
    if data.prediction is not None:
        prediction = data.prediction
        if prediction.assumed_hz:
            bands = ", ".join(f"{hz} Hz" for hz in prediction.assumed_hz)
            said.append(f"At {bands} no source gives every coefficient; what is missing is assumed by a stated "
                        "rule with a wide uncertainty, and no verdict rests on it alone.")  # fmt: skip
        if prediction.capped:
            said.append(
                f"{prediction.capped} coefficients above 0.99 (normal for laboratory values) count as 0.99 in the logarithmic formulas and in ray tracing; Sabine takes them as they are."
            )
    said.append(
        f"Dimensions are good to {Quantities(data.units).small(data.room.shape.uncertainty * 1000)} (standard uncertainty)."
    )
    said.append(
        "The formulas take the sound field as diffuse, which small rooms are not at low frequencies."
    )
    builder = Builder().bullets(said).bullets(data.warnings, "Doubts about the input")
    return builder.section("Assumptions")


def reproduction_sections(data: ReportData) -> list[Section]:
    """Program version and digests of the input."""
    builder = Builder()
    if data.version:
        builder.words(
            f"Made by room treatment planner {data.version}{f', {data.date}' if data.date else ''}."
        )
    rows = [(file.name, file.sha256) for file in data.inputs]
    builder.table(("input", "SHA-256"), rows, wide=1, small=True)
    if rows:
        builder.words("The same version with the same input makes the same report, byte for byte.")
    return builder.section("How to make this report again")


def source_sections(data: ReportData) -> list[Section]:
    """Where every coefficient and the target come from."""
    builder = Builder()
    if data.target is not None:
        builder.words(
            f"Target: {data.target.description or data.target.name}. {data.target.citation}."
        )
        if data.target.note:
            builder.words(data.target.note)
    names = [] if data.surfaces is None else [*data.surfaces.materials, *data.surfaces.items]
    rows = []
    for name in dict.fromkeys(names):
        material = data.materials.get(name)
        if material is not None:
            place = f", {material.place_in_source}" if material.place_in_source else ""
            note = f"; {material.note}" if material.note else ""
            rows.append(
                (name, material.description, f"{material.source or 'no source given'}{place}{note}")
            )
    builder.table(("material", "description", "source"), rows, wide=2, small=True)
    heads = ("product", "coefficients " + ", ".join(str(hz) for hz in OCTAVES) + " Hz", "source")
    builder.table(heads, data.product_sources, wide=2, small=True)
    builder.bullets(data.bibliography, "Bibliography")
    return builder.section("Sources of every coefficient and target")


def word_sections() -> list[Section]:
    """Terms, a line each."""
    return (
        Builder()
        .bullets(
            (
                "Reverberation time T: seconds until a sound that stops has fallen by 60 dB.",
                "Octave band: a range of pitch one octave wide, named by its middle (63 Hz deep bass, 8 kHz hiss).",
                "Absorption coefficient α: share of the sound that a surface does not give back; laboratory values can exceed 1.",
                "Absorption area A: square metres of perfect absorption that would do the same.",
                "Room mode: a pitch at which the room itself swings; below the Schroeder frequency they stand out one by one.",
                "Interval: where the true value lies with the stated probability.",
            )
        )
        .section("Words")
    )
