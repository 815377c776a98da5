"""What surfaces are made of: ``materials``, from tables or built up layer by layer."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from planner.bands import OCTAVES, band_label
from planner.cli.options import AsJson
from planner.cli.output import number, print_json, say, table, warn_all

if TYPE_CHECKING:
    from planner.absorption.build_up import BuildUp


def register(app: typer.Typer) -> None:
    """Add the command."""
    app.command(
        epilog="Examples: planner materials plasterboard; planner materials --build-up "
        '"porous 50 flow_resistivity=10000 + air 50"'
    )(materials)


def materials(
    words: Annotated[
        list[str] | None, typer.Argument(help="Part of an id or description; all where none.")
    ] = None,
    build_up: Annotated[
        str | None,
        typer.Option(
            "--build-up",
            metavar="LAYERS",
            help="Instead: what these layers absorb, from the room to the wall, as a room file or a "
            "catalogue names them.",
        ),
    ] = None,
    as_json: AsJson = False,
) -> None:
    """List the materials that a room file may name, with their sources; or work out a build-up."""
    if build_up is not None:
        _built_up(build_up, as_json)
        return
    from planner.absorption.library import bibliography, builtin, coefficients

    terms = [word.lower() for word in words or []]
    found = [
        material
        for material in builtin().values()
        if all(
            term in f"{material.id} {material.description} {material.category}".lower()
            for term in terms
        )
    ]
    if as_json:
        print_json(
            {
                "bands_hz": OCTAVES,
                "materials": [
                    {
                        "id": material.id,
                        "description": material.description,
                        "category": material.category,
                        "mounting": material.mounting,
                        "per_item": material.per_item,
                        "alpha": material.alpha,
                        "u": coefficients(material).u,
                        "source": bibliography()[material.source],
                        "place_in_source": material.place_in_source,
                    }
                    for material in found
                ],
            }
        )
        return
    for per_item, title in (
        (False, "Absorption coefficient per octave (Hz), from tables"),
        (True, "Absorption area of one piece per octave (m²), from tables"),
    ):
        rows = [
            [
                material.id,
                *(number(value) for value in material.alpha),
                material.source,
            ]
            for material in found
            if material.per_item is per_item
        ]
        if rows:
            table(["id", *map(band_label, OCTAVES), "source"], rows, title=title)
    if not found:
        near = ", ".join(builtin().near(" ".join(terms))) or "none"
        say(f"No material has these words. The nearest: {near}.")


def _built_up(text: str, as_json: bool) -> None:
    from planner.absorption.build_up import build_up
    from planner.absorption.build_up_text import layers_from_text

    built = build_up(layers_from_text(text))
    rated = built.ratings()
    if as_json:
        print_json(
            {
                "bands_hz": OCTAVES,
                "alpha": built.octaves(),
                "u": built.uncertainty(),
                "basis": "model",
                "depth_mm": built.depth_mm,
                "resonance_hz": built.resonance_hz(),
                "alpha_w": rated.weighted.alpha_w,
                "shape": rated.weighted.shape,
                "class": rated.weighted.absorption_class,
                "nrc": rated.nrc,
                "saa": rated.saa,
                "warnings": built.notes(),
            }
        )
        return
    _show(built)


def _show(built: BuildUp) -> None:
    from planner.absorption.build_up_text import text_of_layers

    say(f"{text_of_layers(built.layers)}: {built.depth_mm:g} mm deep")
    say()
    alpha, u = built.octaves(), built.uncertainty()
    table(
        ["", *map(band_label, OCTAVES)],
        [["coefficient", *map(number, alpha)], ["± 95 %", *map(number, 2.0 * u)]],
        title="Absorption coefficient per octave (Hz), by model for sound from all directions",
    )
    rated = built.ratings()
    kind = rated.weighted.absorption_class
    say(
        f"Weighted coefficient {rated.weighted}, {kind if len(kind) > 1 else f'class {kind}'} "
        f"(ISO 11654:1997); NRC {rated.nrc:.2f}, SAA {rated.saa:.2f} (ASTM C423)."
    )
    say(f"Absorbs most at {built.resonance_hz():.0f} Hz where sound comes from straight ahead.")
    say("A model, not a laboratory: the interval is of the difference between the two.")
    warn_all(built.notes())
