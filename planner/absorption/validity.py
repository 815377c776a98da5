"""Where a build-up is worked out beyond what its models hold for, in words."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.absorption.build_up_checks import open_area
from planner.absorption.porous import SPEED, fitted_range
from planner.bands import OCTAVES

WAVELENGTHS = 2.0 * np.pi
"""Openings act as one mass while the wavelength is longer than this many times their spacing and the
depth of what moves in them: where k L = 1; from memory. [-]"""

FINEST_MM = 1.0
"""Holes wider than this are no microperforation. [mm]"""


def doubts(layers: Sequence[Mapping[str, Any]]) -> tuple[str, ...]:
    """What to doubt in coefficients worked out from checked layers, from the front to the wall."""
    found = [word for layer in layers for word in _OF[layer["layer"]](layer)]
    moving = any(layer["layer"] not in ("porous", "air") for layer in layers)
    if moving and any(layer["layer"] == "air" and not layer.get("local") for layer in layers):
        found.append(
            "the air behind the sheet is taken as undivided; battens that divide it: local = true"
        )
    return tuple(dict.fromkeys(found))


def _porous(layer: Mapping[str, Any]) -> list[str]:
    model, resistivity = layer.get("model", "miki"), float(layer["flow_resistivity"])
    if model == "jca":
        named = ("porosity", "tortuosity", "viscous_length_um", "thermal_length_um")
        missing = [key for key in named if key not in layer]
        return [f"usual values are assumed for {', '.join(missing)}"] if missing else []
    low, high = fitted_range(model, resistivity)
    outside = _octaves(lambda hz: (hz <= low) | (hz >= high))
    if not outside:
        return []
    return [
        f"the {model} model is outside its fitted range ({low:.0f} to {high:.0f} Hz for "
        f"{resistivity:g} Pa s/m²) at {outside}"
    ]


def _openings(layer: Mapping[str, Any]) -> list[str]:
    wide = float(layer["slot_mm"] if layer["layer"] == "slotted" else layer["hole_mm"])
    share = open_area(layer)
    area = np.pi / 4.0 * wide**2
    spacing = wide / share if layer["layer"] == "slotted" else float(np.sqrt(area / share))
    longest = max(spacing, float(layer["thickness_mm"]) + wide) / 1000.0
    highest = SPEED / (WAVELENGTHS * longest)
    outside = _octaves(lambda hz: hz > highest)
    if not outside:
        return []
    return [
        f"openings {spacing:.3g} mm apart act as one mass up to {highest:.0f} Hz only, not at {outside}"
    ]


def _fine_openings(layer: Mapping[str, Any]) -> list[str]:
    found = _openings(layer)
    if layer["hole_mm"] > FINEST_MM:
        found.append(f"Maa's formula is meant for holes up to {FINEST_MM:g} mm")
    return found


def _panel(layer: Mapping[str, Any]) -> list[str]:
    return ["the panel is taken as limp: its stiffness and its frame are left out"]


def _nothing(layer: Mapping[str, Any]) -> list[str]:
    return []


def _octaves(outside: Callable[[NDArray[np.float64]], NDArray[np.bool_]]) -> str:
    hertz = np.array(OCTAVES, float)
    names = [f"{hz:.0f}" for hz in hertz[outside(hertz)]]
    return f"{', '.join(names)} Hz" if names else ""


_OF: dict[str, Callable[[Mapping[str, Any]], list[str]]] = {
    "porous": _porous,
    "air": _nothing,
    "perforated": _openings,
    "slotted": _openings,
    "microperforated": _fine_openings,
    "panel": _panel,
}
