"""Predicted and measured side by side: by how much they differ, and whether that means anything."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.reconcile.doubts import climate_doubt, state_doubt, unit_slip
from planner.reconcile.octaves import octave_times
from planner.reconcile.words import json_list, listed_bands

if TYPE_CHECKING:
    from planner.absorption.library import Library
    from planner.air import Air
    from planner.measure.measured import Measured
    from planner.predict.prediction import Prediction
    from planner.reconcile.calibration import Calibration
    from planner.room.model import Room

RANGE_FORMULAS = ("sabine", "eyring")
"""The formulas between which a prediction is shown as a range."""

NOTICEABLE = 2.0
"""Standard uncertainties from which a difference is called one. [-]"""


@dataclass(frozen=True, slots=True)
class Comparison:
    """Predicted against measured per octave; NaN where one of them is missing."""

    bands_hz: tuple[int, ...]
    """[Hz]"""
    formula: str
    """The formula that is compared: the one the room's target must be met by."""
    predicted: NDArray[np.float64]
    """By that formula. [s]"""
    predicted_u: NDArray[np.float64]
    """Standard uncertainty of `predicted`. [s]"""
    predicted_by: dict[str, NDArray[np.float64]]
    """By every formula that was predicted. [s]"""
    measured: NDArray[np.float64]
    """[s]"""
    measured_u: NDArray[np.float64]
    """Standard uncertainty of `measured`. [s]"""
    assumed_hz: tuple[int, ...]
    """Bands predicted from assumed coefficients. [Hz]"""
    warnings: tuple[str, ...]
    calibration: Calibration | None = None

    @property
    def predicted_range(self) -> NDArray[np.float64]:
        """Lowest and highest time by Sabine and Eyring, shape ``(2, band)``. [s]."""
        known = [self.predicted_by[name] for name in RANGE_FORMULAS if name in self.predicted_by]
        stack = np.array(known or [self.predicted])
        return np.array([stack.min(axis=0), stack.max(axis=0)])

    @property
    def difference_s(self) -> NDArray[np.float64]:
        """Measured less predicted: positive where the room rings longer than predicted. [s]."""
        return _finite(self.measured - self.predicted)

    @property
    def difference_percent(self) -> NDArray[np.float64]:
        """`difference_s` in percent of the prediction. [%]."""
        return 100.0 * self.difference_s / self.predicted

    @property
    def z(self) -> NDArray[np.float64]:
        """`difference_s` in standard uncertainties, both sides' combined. [-]."""
        return self.difference_s / np.hypot(self.predicted_u, self.measured_u)

    @property
    def words(self) -> tuple[str, ...]:
        """What the numbers say, in sentences."""
        return _verdicts(self)

    def to_json(self) -> dict[str, Any]:
        """What ``planner compare --json`` prints; a missing value is None."""
        low, high = self.predicted_range
        content: dict[str, Any] = {
            "bands_hz": list(self.bands_hz),
            "formula": self.formula,
            "predicted": json_list(self.predicted),
            "predicted_u_s": json_list(self.predicted_u),
            "predicted_by": {name: json_list(value) for name, value in self.predicted_by.items()},
            "predicted_range": {"low": json_list(low), "high": json_list(high)},
            "measured": json_list(self.measured),
            "measured_u_s": json_list(self.measured_u),
            "difference_s": json_list(self.difference_s),
            "difference_percent": json_list(self.difference_percent),
            "z": json_list(self.z),
            "assumed_hz": list(self.assumed_hz),
            "words": list(self.words),
            "warnings": list(self.warnings),
            "calibrated": [],
        }
        if self.calibration is not None:
            content |= self.calibration.to_json()
        return content


def _finite(values: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.where(np.isfinite(values), values, np.nan)


def compare(
    prediction: Prediction,
    measured: Measured,
    *,
    formula: str = "eyring",
    state: str | None = None,
    air: Air | None = None,
    calibration: Calibration | None = None,
) -> Comparison:
    """Predicted and measured reverberation times side by side.

    Parameters
    ----------
    prediction
        Of the room as it was measured, untreated or treated.
    measured
        In octaves or one-third octaves.
    formula
        The room's ``[treatment] formula``; with ``both``, Eyring's is compared and the range shown.
    state
        The state that the room file describes: ``empty``, ``furnished`` or ``occupied``.
    air
        The air that the room file describes.
    calibration
        Which coefficients explain the difference, to be carried along.

    Returns
    -------
    comparison
        Over the octaves 63 Hz to 8 kHz.
    """
    name = "eyring" if formula == "both" else formula
    times = octave_times(measured)
    by = {key: _on_octaves(prediction, value) for key, value in prediction.methods.items()}
    predicted = by[name]
    doubts = (
        unit_slip(predicted, times.t_s),
        state_doubt(state, measured.state),
        climate_doubt(predicted, air, measured.air),
    )
    return Comparison(
        bands_hz=OCTAVES,
        formula=name,
        predicted=predicted,
        predicted_u=_on_octaves(prediction, prediction.u_s),
        predicted_by=by,
        measured=times.t_s,
        measured_u=times.u_s,
        assumed_hz=tuple(prediction.assumed_hz),
        warnings=(*times.warnings, *(doubt for doubt in doubts if doubt)),
        calibration=calibration,
    )


def compare_room(
    room: Room, measured: Measured, *, library: Library | None = None, calibrated: bool = True
) -> Comparison:
    """Predict a room, compare it with its measurement and find what explains the difference.

    A calibration that is refused (another state, a slip of the unit) becomes a warning here: the
    comparison is what shows why.
    """
    from dataclasses import replace

    from planner.errors import MeasuredError
    from planner.predict.prediction import predict
    from planner.reconcile.calibrate import calibrate_room
    from planner.room.surfaces import room_surfaces

    prediction = predict(
        room_surfaces(room, library),
        room.air_state(),
        methods=RANGE_FORMULAS,
        formula="sabine" if room.treatment.formula == "sabine" else "eyring",
    )
    calibration, refusal = None, []
    if calibrated:
        try:
            calibration = calibrate_room(room, measured, library=library)
        except MeasuredError as error:
            refusal = [f"No coefficients are corrected: {error}"]
    comparison = compare(
        prediction,
        measured,
        formula=room.treatment.formula,
        state=room.described_state,
        air=room.air_state(),
        calibration=calibration,
    )
    return replace(comparison, warnings=(*comparison.warnings, *refusal))


def _on_octaves(prediction: Prediction, values: Any) -> NDArray[np.float64]:
    """Values over the prediction's bands as values over all octaves, NaN where there are none."""
    by_band = dict(zip(prediction.bands_hz, np.asarray(values, float), strict=True))
    return np.array([by_band.get(hz, np.nan) for hz in OCTAVES])


def _verdicts(comparison: Comparison) -> tuple[str, ...]:
    """One sentence for each group of bands that behave alike."""
    z, bands = comparison.z, np.array(comparison.bands_hz)
    groups = (
        (z >= NOTICEABLE, "Rings longer than predicted at {}: less is absorbed than assumed."),
        (z <= -NOTICEABLE, "Rings shorter than predicted at {}: more is absorbed than assumed."),
        (np.abs(z) < NOTICEABLE, "Agrees within the uncertainty of both at {}."),
        (np.isnan(z), "Nothing can be compared at {}: no value was measured."),
    )
    return tuple(text.format(listed_bands(bands[mask])) for mask, text in groups if mask.any())
