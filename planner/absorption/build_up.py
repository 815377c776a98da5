"""Absorbers by their build-up: a description that fits a TOML file, and the coefficients it gives.

Layers run from the front to the wall, which is rigid::

    build_up = [
      { layer = "perforated", thickness_mm = 6, hole_mm = 5, open_area = 0.08 },
      { layer = "porous", thickness_mm = 50, flow_resistivity = 10000 },
      { layer = "air", thickness_mm = 50 },
    ]

A cell of a table holds the same list, or a short line: see `build_up_text`.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.absorption.build_up_checks import checked_layers, open_area
from planner.absorption.layers import (
    FIELD_DEG,
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
from planner.absorption.porous import IMPEDANCE
from planner.absorption.ratings import Ratings, ratings_of_thirds
from planner.absorption.validity import doubts
from planner.bands import OCTAVES, THIRDS, band_edges
from planner.errors import MaterialError

Array = NDArray[np.float64]

PER_OCTAVE, PER_THIRD = 9, 5
"""Frequencies behind a band's value: 81 in an octave change no build-up tried here by more than 0.015."""

POROUS_U = np.array([0.20, 0.20, 0.30, 0.30, 0.20, 0.12, 0.12, 0.15])
"""Standard uncertainty of a modelled porous absorber against a laboratory's, per octave: about the root
mean square by which published 50 and 100 mm wools lie beside the model (a test holds it). Samples of
10 m² absorb at their edges too, so laboratories read higher: on average by 0.14, 0.31, 0.26 and 0.12
from 125 Hz to 1 kHz, by 0.03 or less above. [-]"""

SHEET_U = np.array([0.25, 0.25, 0.25, 0.25, 0.15, 0.10, 0.10, 0.10])
"""The same with a sheet or panel in front, from three published build-ups (a test holds it). [-]"""

LARGEST_U_SHARE = 0.5
"""But of a porous absorber not more than this share where little is absorbed. A sheet absorbs more away
from its resonance than its model says, so its uncertainty has no such limit. [-]"""

PANEL_LOSS = 0.3
"""Resistance of a panel that names none, as a share of ρ c; a judgement. [-]"""


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

    @property
    def gap_mm(self) -> float:
        """The air in it. [mm]."""
        return float(sum(one["thickness_mm"] for one in self.layers if one["layer"] == "air"))

    @property
    def has_sheet(self) -> bool:
        """Whether a sheet or panel is among the layers."""
        return any(layer["layer"] not in ("porous", "air") for layer in self.layers)

    def octaves(self, *, field: bool = False) -> Array:
        """Random-incidence (or field-incidence, to 78°) coefficient per octave. [-].

        The mean over frequencies spread evenly over the logarithm of each band.
        """
        return self._bands(octave_frequencies(), field)

    def thirds(self, *, field: bool = False) -> Array:
        """The same per one-third octave of `planner.bands.THIRDS`. [-]."""
        return self._bands(_frequencies(THIRDS, PER_THIRD, 3), field)

    def _bands(self, f: Array, field: bool) -> Array:
        largest = FIELD_DEG if field else 90.0
        alpha = random_incidence(self.at(f.ravel()), f.ravel(), largest_deg=largest)
        mean: Array = alpha.reshape(f.shape).mean(axis=1)
        return mean

    def ratings(self) -> Ratings:
        """Weighted coefficient and class, NRC and SAA, from its one-third octaves."""
        return ratings_of_thirds(self.thirds())

    def resonance_hz(self) -> float:
        """Frequency of most absorption at normal incidence between 20 Hz and 10 kHz. [Hz]."""
        f = np.geomspace(20.0, 10_000.0, 1200)
        return float(f[np.argmax(normal_incidence(self.at(f), f))])

    def uncertainty(self) -> Array:
        """Standard uncertainty of `octaves` against a laboratory's. [-]."""
        return model_uncertainty(self.octaves(), sheet=self.has_sheet)

    def notes(self) -> tuple[str, ...]:
        """Where the models are used beyond what they hold for, in words."""
        return doubts(self.layers)


def octave_frequencies() -> Array:
    """`PER_OCTAVE` frequencies in every octave, evenly over its logarithm, ``(band, n)``. [Hz]."""
    return _frequencies(OCTAVES, PER_OCTAVE, 1)


def _frequencies(nominal: Sequence[int], count: int, fraction: int) -> Array:
    low, high = band_edges(nominal, fraction=fraction)
    step = (np.arange(count) + 0.5) / count
    frequencies: Array = low[:, None] * (high / low)[:, None] ** step
    return frequencies


def build_up(layers: Sequence[Mapping[str, Any]]) -> BuildUp:
    """Check a description of layers.

    Raises
    ------
    MaterialError
        An unknown layer or key, a missing or absurd value; it says which layer and what is right.
    """
    return BuildUp(checked_layers(layers))


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
        layer["thickness_mm"] / 1000.0, opening / 1000.0, open_area(layer), f
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


def model_uncertainty(alpha: ArrayLike, *, sheet: bool = False) -> Array:
    """Standard uncertainty of a modelled coefficient against a laboratory's, ``(..., band)``. [-].

    Parameters
    ----------
    alpha
        The model's coefficients over `planner.bands.OCTAVES`. [-]
    sheet
        Whether a sheet or panel is among the layers.
    """
    values = np.asarray(alpha, float)
    if sheet:
        return np.broadcast_to(SHEET_U, values.shape).copy()
    u: Array = np.minimum(POROUS_U, np.maximum(LARGEST_U_SHARE * values, 0.02))
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
    doubt = model_uncertainty(alpha, sheet=checked.has_sheet)
    return Material(
        id=material_id,
        description=description,
        category="build-up",
        mounting="build-up",
        thickness_mm=checked.depth_mm - checked.gap_mm,
        gap_mm=checked.gap_mm,
        alpha=tuple(float(value) for value in alpha),
        u=tuple(float(value) for value in doubt),
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

    Notes
    -----
    Half a millisecond each. Arrays over the choices were tried: no faster, since one choice fills the
    processor's cache with its frequencies and angles already.
    """
    thick, space = np.broadcast_arrays(
        np.atleast_1d(np.asarray(thickness, float)), np.atleast_1d(np.asarray(gap, float))
    )
    f = octave_frequencies().ravel()
    rows = []
    for one_thick, one_space in zip(thick, space, strict=True):
        layers: list[Layer] = [Porous(float(one_thick), flow_resistivity, model)]
        if one_space > 0:
            layers.append(AirGap(float(one_space)))
        rows.append(random_incidence(layers, f).reshape(len(OCTAVES), PER_OCTAVE).mean(axis=1))
    return np.array(rows)
