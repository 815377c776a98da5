"""Descriptions of layers: what each kind needs, between which limits, and refusals in words."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from planner.errors import MaterialError

KEYS: dict[str, tuple[set[str], set[str]]] = {
    "porous": (
        {"thickness_mm", "flow_resistivity"},
        {"model", "porosity", "tortuosity", "viscous_length_um", "thermal_length_um", "local"},
    ),
    "air": ({"thickness_mm"}, {"local"}),
    "perforated": ({"thickness_mm", "hole_mm"}, {"open_area", "spacing_mm"}),
    "slotted": ({"thickness_mm", "slot_mm"}, {"open_area", "spacing_mm"}),
    "microperforated": ({"thickness_mm", "hole_mm"}, {"open_area", "spacing_mm"}),
    "panel": ({"mass_kg_m2"}, {"resistance"}),
}
"""Needed and optional keys of each kind of layer."""

LIMITS: dict[str, tuple[float, float]] = {
    "thickness_mm": (0.05, 2000.0),
    "flow_resistivity": (500.0, 500_000.0),
    "porosity": (0.3, 1.0),
    "tortuosity": (1.0, 10.0),
    "viscous_length_um": (1.0, 5000.0),
    "thermal_length_um": (1.0, 5000.0),
    "hole_mm": (0.05, 100.0),
    "slot_mm": (0.2, 200.0),
    "spacing_mm": (0.2, 1000.0),
    "open_area": (0.0005, 0.9),
    "mass_kg_m2": (0.05, 100.0),
    "resistance": (0.0, 20_000.0),
}
"""Between which a value is plausible, in the key's own unit."""

CURES = {
    "flow_resistivity": (
        "Makers state it in Pa s/m²; usual are 5000 for light wool, 10000 to 20000 for boards, 40000 "
        "for dense ones (common practice, no source)."
    ),
    "mass_kg_m2": "Density times thickness: 6 mm plywood weighs about 4 kg/m².",
}
"""What helps where a value is missing."""

MODELS = ("miki", "delany-bazley", "jca")
"""Of porous layers; the first where none is named."""

MOST_LAYERS = 12


def checked_layers(layers: Sequence[Mapping[str, Any]]) -> tuple[dict[str, Any], ...]:
    """Layers that can be worked out, from the front to the wall.

    Raises
    ------
    MaterialError
        An unknown layer or key, a missing or absurd value; it says which layer and what is right.
    """
    if isinstance(layers, str | bytes | Mapping) or not isinstance(layers, Sequence):
        raise MaterialError("is no list of layers", cure="Write [{ … }, { … }].")
    if not layers:
        raise MaterialError("has no layers", cure='Begin with { layer = "porous", … }.')
    if len(layers) > MOST_LAYERS:
        raise MaterialError(
            f"has {len(layers)} layers", cure=f"Up to {MOST_LAYERS} can be worked out."
        )
    found = tuple(_checked(layer, f"layer {number}") for number, layer in enumerate(layers, 1))
    if found[-1]["layer"] not in ("porous", "air"):
        raise MaterialError(
            f"ends with a {found[-1]['layer']} sheet right on the wall, where it cannot move",
            where=f"layer {len(found)}",
            cure="Put air or a porous layer behind it.",
        )
    return found


def open_area(layer: Mapping[str, Any], where: str = "") -> float:
    """Share of holes or slots, given or from their spacing on a square grid. [-].

    Raises
    ------
    MaterialError
        Neither is given, or they give an impossible share.
    """
    if "open_area" in layer:
        return float(layer["open_area"])
    if "spacing_mm" not in layer:
        raise MaterialError(
            f"{layer['layer']} needs open_area or spacing_mm", where=where, cure="open_area = 0.08"
        )
    spacing = float(layer["spacing_mm"])
    if layer["layer"] == "slotted":
        share = float(layer["slot_mm"]) / spacing
    else:
        share = math.pi / 4.0 * (float(layer["hole_mm"]) / spacing) ** 2
    if not LIMITS["open_area"][0] <= share <= LIMITS["open_area"][1]:
        raise MaterialError(
            f"an open share of {share:.3g} cannot be",
            where=where,
            cure="Check the size of the openings and spacing_mm (from centre to centre).",
        )
    return share


def _checked(layer: Mapping[str, Any], where: str) -> dict[str, Any]:
    if not isinstance(layer, Mapping):
        raise MaterialError("is no table", where=where, cure='Write { layer = "air", … }.')
    kind = layer.get("layer")
    if not isinstance(kind, str) or kind not in KEYS:
        raise MaterialError(
            f"{kind!r} is no layer known here", where=where, cure=f"Use {', '.join(KEYS)}."
        )
    _check_keys(layer, kind, where)
    for key, value in layer.items():
        if key in LIMITS:
            _check_number(key, value, where)
    model, local = layer.get("model", MODELS[0]), layer.get("local", False)
    if model not in MODELS:
        raise MaterialError(f"{model!r} is no model", where=where, cure=f"Use {', '.join(MODELS)}.")
    if not isinstance(local, bool):
        raise MaterialError(f"local = {local!r} is no yes or no", where=where, cure="local = true")
    if "open_area" in KEYS[kind][1]:
        open_area(layer, where)
    return dict(layer)


def _check_keys(layer: Mapping[str, Any], kind: str, where: str) -> None:
    needed, optional = KEYS[kind]
    for key in layer:
        if key not in needed | optional | {"layer"}:
            known = ", ".join(sorted(needed | optional))
            raise MaterialError(f"{key!r} is no key of {kind}", where=where, cure=f"Use {known}.")
    for key in sorted(needed):
        if key not in layer:
            raise MaterialError(f"{kind} needs {key}", where=where, cure=CURES.get(key))
    if {"open_area", "spacing_mm"} <= set(layer):
        raise MaterialError(
            "has both open_area and spacing_mm", where=where, cure="One follows from the other."
        )


def _check_number(key: str, value: Any, where: str) -> None:
    low, high = LIMITS[key]
    number = isinstance(value, int | float) and not isinstance(value, bool)
    if number and low <= value <= high:
        return
    hint = f"It must lie from {low:g} to {high:g}."
    if key == "open_area" and number and 1 < value <= 90:
        hint = f"Write {value / 100:g} for {value:g} %."
    raise MaterialError(f"{key} = {value!r} cannot be", where=where, cure=hint)
