"""Everything a report may hold; the project fills in what it has, and the rest is left out."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.report.acceptance import Acceptance
from planner.report.buying import BuyingList
from planner.report.drawings import Panel

if TYPE_CHECKING:
    from planner.absorption.library import Material
    from planner.predict.prediction import Prediction
    from planner.predict.targets import TargetLimits
    from planner.reconcile.compare import Comparison
    from planner.reconcile.proof import Proof
    from planner.room.model import Room
    from planner.room.surfaces import RoomSurfaces
    from planner.treat.suggestion import Suggestion

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class ModeList:
    """Modes as they are drawn and listed."""

    hz: Array
    """Ascending. [Hz]"""
    kinds: tuple[str, ...]
    labels: tuple[str, ...]
    """``1 0 0`` for a box."""
    t_s: Array | None = None
    """Decay time of each. [s]"""
    schroeder_hz: float | None = None
    """[Hz]"""
    third_octaves_hz: tuple[float, ...] = ()
    """[Hz]"""
    third_octave_count: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class Measurement:
    """A measurement as it is reported."""

    bands_hz: tuple[float, ...]
    """[Hz]"""
    t_s: Array
    """NaN where the recordings give none. [s]"""
    u_s: Array
    """Standard uncertainty. [s]"""
    evaluation: tuple[str, ...] = ()
    """``t20``, ``t30``, ``whole-decay`` …, per band."""
    range_db: Array | None = None
    """Decay above the background noise. [dB]"""
    flags: tuple[tuple[str, ...], ...] = ()
    state: str = ""
    date: str = ""
    grade: str = ""
    """``survey``, ``engineering`` or ``precision`` by ISO 3382-2, with its reason."""
    positions: str = ""
    """Source and microphone positions and decays, in words."""
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Alternative:
    """One option of the comparison."""

    name: str
    predicted: Array
    """Shape ``(band,)``. [s]"""
    cost: float | None = None
    probability: float | None = None
    """Of lying inside the target. [-]"""
    outside_hz: tuple[int, ...] = ()
    """Bands outside the target. [Hz]"""
    depth_mm: float | None = None
    """The deepest build-up in it. [mm]"""
    area_m2: float | None = None
    """Covered. [m²]"""
    cost_per_m2_125: float | None = None
    """Cost per m² of absorption area added at 125 Hz."""
    cost_per_m2_1000: float | None = None
    """The same at 1 kHz."""
    chosen: bool = False
    note: str = ""


@dataclass(frozen=True, slots=True)
class InputFile:
    """A file that the report was made from."""

    name: str
    sha256: str


@dataclass(frozen=True, slots=True)
class ReportData:
    """What a report is made from. Only the room must be there."""

    room: Room
    surfaces: RoomSurfaces | None = None
    materials: Mapping[str, Material] = field(default_factory=dict)
    """Where the materials of the room (and of build-ups) are looked up."""
    target: TargetLimits | None = None
    prediction: Prediction | None = None
    """Of the room as it is."""
    modes: ModeList | None = None
    measurement: Measurement | None = None
    comparison: Comparison | None = None
    calibrated: tuple[tuple[str, str, str, str], ...] = ()
    """Material, band, coefficient assumed, coefficient that fits (with its uncertainty)."""
    calibration_words: tuple[str, ...] = ()
    options: tuple[Alternative, ...] = ()
    suggestion: Suggestion | None = None
    after: Prediction | None = None
    """Of the treated room."""
    treatment_name: str = ""
    buying: BuyingList | None = None
    panels: tuple[Panel, ...] = ()
    proof: Proof | None = None
    acceptance: Acceptance | None = None
    product_sources: tuple[tuple[str, str, str], ...] = ()
    """Product, coefficients in words, source."""
    bibliography: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
    inputs: tuple[InputFile, ...] = ()
    version: str = ""
    date: str = ""
    """As printed, from the input."""
    timestamp: int = 0
    """Of the newest input; the PDF's own date. [s]"""
    units: str = "m"
    """``m`` or ``ft`` throughout."""
    paper: str = "a4"
    extra: Mapping[str, Any] = field(default_factory=dict)


def band_heads() -> list[str]:
    """Headings of the octave columns."""
    return [f"{hz} Hz" if hz < 1000 else f"{hz // 1000} kHz" for hz in OCTAVES]
