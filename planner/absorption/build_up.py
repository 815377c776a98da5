"""Absorbers by their build-up: a description that fits a TOML file, and the coefficients it gives.

Layers run from the front to the wall, which is rigid::

    build_up = [
      { layer = "perforated", thickness_mm = 6, hole_mm = 5, open_area = 0.08 },
      { layer = "porous", thickness_mm = 50, flow_resistivity = 10000 },
      { layer = "air", thickness_mm = 50 },
    ]
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.absorption.layers import (
    AirGap,
    Layer,
    Porous,
    Sheet,
    microperforated,
    normal_incidence,
    perforated,
    random_incidence,
    slotted,
)
from planner.absorption.library import Material
from planner.absorption.porous import IMPEDANCE, in_range
from planner.bands import OCTAVES, band_edges
from planner.errors import MaterialError

Array = NDArray[np.float64]

PER_OCTAVE = 9
"""Frequencies behind an octave's value."""

MODEL_U = np.array([0.20, 0.20, 0.30, 0.30, 0.20, 0.12, 0.12, 0.15])
"""Standard uncertainty of a modelled coefficient against a laboratory's, per octave: about the root
mean square by which published 50 and 100 mm wools lie beside the model (a test holds it). Samples
of 10 m² absorb at their edges too, so laboratories read higher, most at 250 and 500 Hz. [-]"""

LARGEST_U_SHARE = 0.5
"""But not more than this share of the coefficient where little is absorbed. [-]"""

PANEL_LOSS = 0.3
"""Resistance of a panel that names none, as a share of ρ c; a judgement. [-]"""

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

_LIMITS: dict[str, tuple[float, float]] = {
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

MODELS = ("miki", "delany-bazley", "jca")


@dataclass(frozen=True, slots=True)
class BuildUp:
    """A checked build-up."""

    layers: tuple[Mapping[str, Any], ...]

    def at(self, frequency: ArrayLike) -> list[Layer]:
        """Its layers at some frequencies [Hz], from the front to the wall."""
        f = np.asarray(frequency, float)
        return [_MAKERS[str(layer["layer"])](layer, f) for layer in self.layers]

    @property
    def depth_mm(self) -> float:
        """What it takes from the room. [mm]."""
        return float(sum(layer.get("thickness_mm", 0.0) for layer in self.layers))

    def octaves(self, *, field: bool = False) -> Array:
        """Random-incidence (or field-incidence, to 78°) coefficient per octave. [-].

        The mean over nine frequencies spread evenly over each octave.
        """
        f = octave_frequencies()
        largest = 78.0 if field else 90.0
        alpha = random_incidence(self.at(f.ravel()), f.ravel(), largest_deg=largest)
        mean: Array = alpha.reshape(f.shape).mean(axis=1)
        return mean

    def resonance_hz(self) -> float:
        """Frequency of most absorption at normal incidence between 20 Hz and 10 kHz. [Hz]."""
        f = np.geomspace(20.0, 10_000.0, 1200)
        return float(f[np.argmax(normal_incidence(self.at(f), f))])

    def notes(self) -> tuple[str, ...]:
        """Where the model is used beyond what it was fitted to, in words."""
        found = []
        for layer in self.layers:
            if layer["layer"] == "porous":
                model = str(layer.get("model", "miki"))
                good = in_range(model, OCTAVES, float(layer["flow_resistivity"]))
                if not good.all():
                    bands = ", ".join(
                        str(hz) for hz, ok in zip(OCTAVES, good, strict=True) if not ok
                    )
                    found.append(
                        f"the {model} model is outside its fitted range at {bands} Hz for "
                        f"{layer['flow_resistivity']:g} Pa s/m²"
                    )
        return tuple(found)


def octave_frequencies() -> Array:
    """`PER_OCTAVE` frequencies in every octave, evenly over its logarithm, ``(band, n)``. [Hz]."""
    low, high = band_edges(OCTAVES)
    step = (np.arange(PER_OCTAVE) + 0.5) / PER_OCTAVE
    frequencies: Array = low[:, None] * (high / low)[:, None] ** step
    return frequencies


def build_up(layers: Sequence[Mapping[str, Any]]) -> BuildUp:
    """Check a description of layers.

    Raises
    ------
    MaterialError
        An unknown layer or key, a missing or absurd value; it says which layer and what is right.
    """
    if not layers:
        raise MaterialError("has no layers", cure='Begin with { layer = "porous", … }.')
    if len(layers) > 12:
        raise MaterialError(f"has {len(layers)} layers", cure="Up to 12 can be worked out.")
    checked = [_checked(layer, number) for number, layer in enumerate(layers, 1)]
    if checked[-1]["layer"] not in ("porous", "air"):
        raise MaterialError(
            f"ends with a {checked[-1]['layer']} sheet right on the wall, where it cannot move",
            where=f"layer {len(checked)}",
            cure="Put air or a porous layer behind it.",
        )
    return BuildUp(tuple(checked))


def _checked(layer: Mapping[str, Any], number: int) -> dict[str, Any]:
    where = f"layer {number}"
    if not isinstance(layer, Mapping):
        raise MaterialError("is no table", where=where, cure='Write { layer = "air", … }.')
    kind = layer.get("layer")
    if kind not in KEYS:
        raise MaterialError(
            f"{kind!r} is no layer known here", where=where, cure=f"Use {', '.join(KEYS)}."
        )
    needed, optional = KEYS[kind]
    for key in layer:
        if key not in needed | optional | {"layer"}:
            known = ", ".join(sorted(needed | optional))
            raise MaterialError(f"{key!r} is no key of {kind}", where=where, cure=f"Use {known}.")
    for key in needed:
        if key not in layer:
            raise MaterialError(f"{kind} needs {key}", where=where)
    for key, value in layer.items():
        if key in _LIMITS:
            _in_limits(key, value, where)
    if layer.get("model", "miki") not in MODELS:
        raise MaterialError(
            f"{layer['model']!r} is no model", where=where, cure=f"Use {', '.join(MODELS)}."
        )
    if {"open_area", "spacing_mm"} <= optional:
        _open_area(layer, where)
    return dict(layer)


def _in_limits(key: str, value: Any, where: str) -> None:
    low, high = _LIMITS[key]
    if isinstance(value, bool) or not isinstance(value, int | float) or not low <= value <= high:
        hint = f"It must lie from {low:g} to {high:g}."
        if key == "open_area" and isinstance(value, int | float) and 1 < value <= 90:
            hint = f"Write {value / 100:g} for {value:g} %."
        raise MaterialError(f"{key} = {value!r} cannot be", where=where, cure=hint)


def _open_area(layer: Mapping[str, Any], where: str) -> float:
    """Share of holes or slots, given or from their spacing on a square grid."""
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
        share = float(np.pi / 4.0 * (float(layer["hole_mm"]) / spacing) ** 2)
    if not 0.0005 <= share <= 0.9:
        raise MaterialError(
            f"an open share of {share:.3g} cannot be",
            where=where,
            cure="Check hole and spacing_mm.",
        )
    return share


def _porous(layer: Mapping[str, Any], f: Array) -> Layer:
    return Porous(
        thickness=layer["thickness_mm"] / 1000.0,
        flow_resistivity=float(layer["flow_resistivity"]),
        model=str(layer.get("model", "miki")),
        porosity=float(layer.get("porosity", 0.97)),
        tortuosity=float(layer.get("tortuosity", 1.0)),
        viscous_length=float(layer.get("viscous_length_um", 80.0)) * 1e-6,
        thermal_length=float(layer.get("thermal_length_um", 160.0)) * 1e-6,
        local=bool(layer.get("local", False)),
    )


def _air(layer: Mapping[str, Any], f: Array) -> Layer:
    return AirGap(layer["thickness_mm"] / 1000.0, bool(layer.get("local", False)))


def _sheet(layer: Mapping[str, Any], f: Array) -> Layer:
    makers: dict[str, Callable[[float, float, float, Array], Sheet]] = {
        "perforated": perforated,
        "slotted": slotted,
        "microperforated": microperforated,
    }
    opening = layer["slot_mm"] if layer["layer"] == "slotted" else layer["hole_mm"]
    return makers[layer["layer"]](
        layer["thickness_mm"] / 1000.0, opening / 1000.0, _open_area(layer, ""), f
    )


def _panel(layer: Mapping[str, Any], f: Array) -> Layer:
    return Sheet(float(layer["mass_kg_m2"]), float(layer.get("resistance", PANEL_LOSS * IMPEDANCE)))


_MAKERS: dict[str, Callable[[Mapping[str, Any], Array], Layer]] = {
    "porous": _porous,
    "air": _air,
    "perforated": _sheet,
    "slotted": _sheet,
    "microperforated": _sheet,
    "panel": _panel,
}


def model_uncertainty(alpha: ArrayLike) -> Array:
    """Standard uncertainty of a modelled coefficient against a laboratory's, ``(..., band)``. [-]."""
    u: Array = np.minimum(MODEL_U, np.maximum(LARGEST_U_SHARE * np.asarray(alpha, float), 0.02))
    return u


def material_from_build_up(
    material_id: str, description: str, layers: Sequence[Mapping[str, Any]]
) -> Material:
    """A material whose coefficients are worked out from its layers.

    Parameters
    ----------
    material_id, description
        Its name, and what it is in words.
    layers
        From the front to the wall.

    Raises
    ------
    MaterialError
        As `build_up`.
    """
    try:
        checked = build_up(layers)
    except MaterialError as error:
        where = ", ".join(part for part in (repr(material_id), error.where) if part)
        raise MaterialError(error.what, where=where, cure=error.cure) from error
    alpha = checked.octaves()
    solid = [
        one["thickness_mm"]
        for one in checked.layers
        if one["layer"] != "air" and "thickness_mm" in one
    ]
    return Material(
        id=material_id,
        description=description,
        category="build-up",
        mounting="build-up",
        thickness_mm=float(sum(solid)),
        gap_mm=checked.depth_mm - float(sum(solid)),
        alpha=tuple(float(value) for value in alpha),
        u=tuple(float(value) for value in model_uncertainty(alpha)),
        source="transfer-matrix model",
        place_in_source="",
        note="; ".join(("estimated from its layers", *checked.notes())),
    )


def porous_octaves(
    thickness: ArrayLike, gap: ArrayLike, flow_resistivity: float, *, model: str = "miki"
) -> Array:
    """Random-incidence octave coefficients of one porous layer over air, for many sizes at once.

    Parameters
    ----------
    thickness, gap
        Broadcast together to shape ``(choice,)``. [m]
    flow_resistivity, model
        Of the layer. [Pa s/m²]

    Returns
    -------
    alpha
        Shape ``(choice, band)``. [-]
    """
    many_thick, many_gap = np.broadcast_arrays(
        np.atleast_1d(np.asarray(thickness, float)), np.atleast_1d(np.asarray(gap, float))
    )
    f = octave_frequencies().ravel()
    rows = []
    for thick, space in zip(many_thick, many_gap, strict=True):
        layers: list[Layer] = [Porous(float(thick), flow_resistivity, model)]
        if space > 0:
            layers.append(AirGap(float(space)))
        rows.append(random_incidence(layers, f).reshape(len(OCTAVES), PER_OCTAVE).mean(axis=1))
    return np.array(rows)
