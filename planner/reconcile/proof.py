"""Before and after: what a treatment was to do, what it did, and whether the target is met."""

from __future__ import annotations

from dataclasses import dataclass
from statistics import NormalDist
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.reconcile.compare import NOTICEABLE, RANGE_FORMULAS, Comparison, compare
from planner.reconcile.words import json_list, listed_bands

if TYPE_CHECKING:
    from planner.air import Air
    from planner.measure.measured import Measured
    from planner.predict.targets import TargetLimits
    from planner.reconcile.calibration import Calibration
    from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

MET, NOT_MET, UNCLEAR = "met", "not met", "cannot be told"


@dataclass(frozen=True, slots=True)
class Installed:
    """A product as it works in this room."""

    product: str
    assumed: Array
    """As sold, shape ``(band,)``. [-] or, for free-standing things, [m²]"""
    found: Array
    """What fits the measurements before and after, shape ``(band,)``."""
    u: Array
    """Standard uncertainty of `found`, shape ``(band,)``."""
    told_apart: NDArray[np.bool_]
    """Where the measurements say something about this product alone, ``(band,)``."""


@dataclass(frozen=True, slots=True)
class Proof:
    """A treatment judged by measurements before and after it."""

    before: Comparison
    after: Comparison
    low: Array
    """Lower limit of the target, shape ``(band,)``; NaN where there is none. [s]"""
    high: Array
    """Upper limit, shape ``(band,)``; NaN where there is none. [s]"""
    confidence: float
    """Probability that the interval behind each band's verdict holds the true time. [-]"""
    calibration: Calibration | None = None
    """Of the treated room, begun where that of the untreated room ended."""

    @property
    def predicted_improvement(self) -> Array:
        """Time before less time after, as predicted, shape ``(band,)``. [s]."""
        return self.before.predicted - self.after.predicted

    @property
    def predicted_improvement_u(self) -> Array:
        """At most: errors that both predictions share are counted twice. ``(band,)``. [s]."""
        u: Array = np.hypot(self.before.predicted_u, self.after.predicted_u)
        return u

    @property
    def measured_improvement(self) -> Array:
        """Time before less time after, as measured, shape ``(band,)``. [s]."""
        return self.before.measured - self.after.measured

    @property
    def measured_improvement_u(self) -> Array:
        """Standard uncertainty, shape ``(band,)``. [s]."""
        u: Array = np.hypot(self.before.measured_u, self.after.measured_u)
        return u

    @property
    def interval(self) -> Array:
        """Lowest and highest true time after treatment, shape ``(2, band)``. [s]."""
        reach = NormalDist().inv_cdf(0.5 + 0.5 * self.confidence) * self.after.measured_u
        return np.array([self.after.measured - reach, self.after.measured + reach])

    @property
    def verdicts(self) -> tuple[str, ...]:
        """Per band ``met``, ``not met``, ``cannot be told``; empty where the target has no limit."""
        return tuple(
            _verdict(*values) for values in zip(*self.interval, self.low, self.high, strict=True)
        )

    @property
    def verdict(self) -> str:
        """Of all bands: one not met is not met; all met is met. Empty without a target."""
        said = [verdict for verdict in self.verdicts if verdict]
        if not said:
            return ""
        if NOT_MET in said:
            return NOT_MET
        return UNCLEAR if UNCLEAR in said else MET

    @property
    def installed(self) -> tuple[Installed, ...]:
        """What stands or hangs in the treated room and not in the untreated one."""
        if self.calibration is None:
            return ()
        return _installed(self.calibration)

    @property
    def words(self) -> tuple[str, ...]:
        """The proof in sentences."""
        return (*_target_words(self), *_improvement_words(self), *_installed_words(self))

    def to_json(self) -> dict[str, Any]:
        """For ``planner compare --json`` with two measurements; a missing value is None."""
        return {
            "bands_hz": list(OCTAVES),
            "before": self.before.to_json(),
            "after": self.after.to_json(),
            "predicted_improvement_s": json_list(self.predicted_improvement),
            "predicted_improvement_u_s": json_list(self.predicted_improvement_u),
            "measured_improvement_s": json_list(self.measured_improvement),
            "measured_improvement_u_s": json_list(self.measured_improvement_u),
            "target": {"low": json_list(self.low), "high": json_list(self.high)},
            "confidence": self.confidence,
            "verdicts": [verdict or None for verdict in self.verdicts],
            "verdict": self.verdict or None,
            "installed": [
                {
                    "product": row.product,
                    "assumed": json_list(row.assumed),
                    "found": json_list(row.found),
                    "u": json_list(row.u),
                    "told_apart": row.told_apart.tolist(),
                }
                for row in self.installed
            ],
            "words": list(self.words),
        }


def prove(
    before: Comparison,
    after: Comparison,
    *,
    target: TargetLimits | None = None,
    confidence: float = 0.9,
    calibration: Calibration | None = None,
) -> Proof:
    """Join the comparisons of the untreated and the treated room to a proof.

    Parameters
    ----------
    before, after
        Predicted against measured, of the untreated and the treated room.
    target
        Limits per octave; none, no verdict.
    confidence
        Of the interval around each measured time; its default is 90 %. [-]
    calibration
        Of the treated room, with that of the untreated one as its prior.

    Notes
    -----
    A band is met when its whole interval lies inside the limits, not met when the whole interval
    lies outside, and cannot be told otherwise: then a better measurement would be needed. The
    confidence holds for each band by itself.
    """
    if not 0.0 < confidence < 1.0:
        raise ValueError(f"a confidence of {confidence:g} is not between 0 and 1")
    none = np.full(len(OCTAVES), np.nan)
    return Proof(
        before=before,
        after=after,
        low=none if target is None else np.asarray(target.low, float),
        high=none if target is None else np.asarray(target.high, float),
        confidence=confidence,
        calibration=calibration,
    )


def prove_room(
    untreated: RoomSurfaces,
    treated: RoomSurfaces,
    air: Air,
    measured_before: Measured,
    measured_after: Measured,
    *,
    target: TargetLimits | None = None,
    formula: str = "eyring",
    state: str | None = None,
    confidence: float = 0.9,
) -> Proof:
    """Predict, compare and calibrate a room before and after its treatment.

    Parameters
    ----------
    untreated, treated
        As they were predicted, both from tables or both from the calibrated room.
    air
        As described.
    measured_before, measured_after
        The two measurements.
    target, confidence
        As in `prove`.
    formula, state
        The room's ``[treatment] formula``, and the state it describes.

    Raises
    ------
    MeasuredError
        Nothing can be learnt from one of the measurements, see `planner.reconcile.calibrate`.
    """
    from planner.predict.prediction import predict
    from planner.reconcile.calibrate import calibrate

    def side(surfaces: RoomSurfaces, measured: Measured) -> Comparison:
        name = "sabine" if formula == "sabine" else "eyring"
        prediction = predict(surfaces, air, methods=RANGE_FORMULAS, formula=name)
        return compare(prediction, measured, formula=formula, state=state, air=air)

    first = calibrate(untreated, air, measured_before, formula=formula, state=state)
    second = calibrate(treated, air, measured_after, formula=formula, state=state, prior=first)
    return prove(
        side(untreated, measured_before),
        side(treated, measured_after),
        target=target,
        confidence=confidence,
        calibration=second,
    )


def _verdict(lowest: float, highest: float, low: float, high: float) -> str:
    if np.isnan(low) and np.isnan(high):
        return ""
    if np.isnan(lowest):
        return UNCLEAR
    # A missing limit compares as False, which is what "no limit" means in both lines.
    if lowest > high or highest < low:
        return NOT_MET
    return UNCLEAR if lowest < low or highest > high else MET


def _installed(calibration: Calibration) -> tuple[Installed, ...]:
    panels = {part.material for part in calibration.described.parts if part.kind == "panel"}
    return tuple(
        Installed(
            product=row.name,
            assumed=row.value,
            found=calibration.value[number],
            u=calibration.u[number],
            told_apart=calibration.told_apart[number],
        )
        for number, row in enumerate(calibration.unknowns)
        if row.kind == "material" and row.name in panels
    )


def _target_words(proof: Proof) -> list[str]:
    if not proof.verdict:
        return ["There is no target to judge by."]
    bands, verdicts = np.array(OCTAVES), np.array(proof.verdicts)
    lines = [f"The target is {proof.verdict} ({proof.confidence:.0%} confidence in each band)."]
    if proof.verdict == UNCLEAR:
        lines = [
            f"Whether the target is met cannot be told ({proof.confidence:.0%} confidence in each "
            "band)."
        ]
    return lines + [
        f"{verdict[0].upper()}{verdict[1:]} at {listed_bands(bands[verdicts == verdict])}."
        for verdict in (MET, NOT_MET, UNCLEAR)
        if (verdicts == verdict).any()
    ]


def _improvement_words(proof: Proof) -> list[str]:
    u = np.hypot(proof.predicted_improvement_u, proof.measured_improvement_u)
    z = (proof.measured_improvement - proof.predicted_improvement) / u
    bands = np.array(OCTAVES)
    groups = (
        (z <= -NOTICEABLE, "The treatment did less than predicted at {}."),
        (z >= NOTICEABLE, "The treatment did more than predicted at {}."),
        (
            np.abs(z) < NOTICEABLE,
            "The treatment did what was predicted, within both uncertainties, at {}.",
        ),
    )
    return [text.format(listed_bands(bands[mask])) for mask, text in groups if mask.any()]


def _installed_words(proof: Proof) -> list[str]:
    return [
        f"{row.product} at {OCTAVES[band]} Hz: {row.assumed[band]:.2f} as sold, "
        f"{row.found[band]:.2f} ± {row.u[band]:.2f} as installed."
        for row in proof.installed
        for band in np.flatnonzero(row.told_apart)
        if abs(row.found[band] - row.assumed[band]) >= NOTICEABLE * row.u[band]
    ]
