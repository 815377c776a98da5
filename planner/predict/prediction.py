"""The prediction of one room: every formula, its interval, its target, and what to doubt."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.air import Air
from planner.bands import OCTAVES
from planner.predict.doubts import doubts
from planner.predict.formulas import METHODS, inputs_of, reverberation_time
from planner.predict.reverberation import LARGEST_ALPHA, schroeder_frequency
from planner.predict.targets import TargetLimits
from planner.predict.uncertainty import contributions, draw
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

DRAWS = 1000
"""Variants behind an interval; its ends are then good to a few percent of its width."""

_MIDDLE = np.array([hz in (500, 1000) for hz in OCTAVES])


@dataclass(frozen=True, slots=True)
class Prediction:
    """What a room should sound like, per octave; bands on the last axis."""

    methods: dict[str, Array]
    """Reverberation time by formula. [s]"""
    formula: str
    """The one that intervals and verdicts belong to."""
    u_s: Array
    """Standard uncertainty of that one's time. [s]"""
    interval_s: Array
    """95 % interval, shape ``(2, band)``. [s]"""
    absorption_area_m2: Array
    speed_of_sound: float
    """[m/s]"""
    air_m_per_m: Array
    """Energy attenuation of the air. [1/m]"""
    volume_m3: float
    surface_m2: float
    schroeder_hz: float
    assumed_hz: tuple[int, ...]
    """Bands in which a coefficient is assumed. [Hz]"""
    capped: int
    """Coefficients above 0.99 that the logarithmic formulas cut down."""
    contributions: dict[str, Array]
    """Share of each uncertain input in the variance. [-]"""
    target: TargetLimits | None = None
    inside: Array = field(default_factory=lambda: np.full(len(OCTAVES), np.nan))
    """Probability of lying inside the target, NaN where it says nothing. [-]"""
    probability: float | None = None
    """Of lying inside it in every judged band at once. [-]"""
    warnings: tuple[str, ...] = ()
    bands_hz: tuple[int, ...] = OCTAVES

    @property
    def time(self) -> Array:
        """Reverberation time by `formula`. [s]."""
        return self.methods[self.formula]

    @property
    def judged(self) -> NDArray[np.bool_]:
        """Bands that a verdict may rest on: the target has a limit and the data are not assumed."""
        if self.target is None:
            return np.zeros(len(OCTAVES), bool)
        known = np.array([hz not in self.assumed_hz for hz in OCTAVES])
        return np.asarray(self.target.judged & known, bool)

    @property
    def misses_target(self) -> bool:
        """Outside the limits in a judged band."""
        return bool(np.any(self.outside & self.judged))

    @property
    def outside(self) -> NDArray[np.bool_]:
        """Bands whose time lies outside the target's limits."""
        if self.target is None:
            return np.zeros(len(OCTAVES), bool)
        return outside_limits(self.time, self.target)

    @property
    def verdicts(self) -> tuple[str, ...]:
        """What the numbers say about the target, in sentences."""
        return tuple(_verdicts(self))

    @property
    def balance(self) -> dict[str, float]:
        """Bass and treble against the middle: T₁₂₅ and T₄₀₀₀ over the mean of 500 Hz and 1 kHz."""
        middle = float(self.time[_MIDDLE].mean())
        return {
            "bass": float(self.time[OCTAVES.index(125)]) / middle,
            "treble": float(self.time[OCTAVES.index(4000)]) / middle,
        }

    def to_json(self) -> dict[str, Any]:
        """What ``planner predict --json`` prints; a missing value is None."""
        target = self.target
        main_input = _largest(self.contributions)
        return {
            "bands_hz": list(self.bands_hz),
            "methods": {name: listed(values) for name, values in self.methods.items()},
            "formula": self.formula,
            "u_s": listed(self.u_s),
            "interval_s": {"low": listed(self.interval_s[0]), "high": listed(self.interval_s[1])},
            "absorption_area_m2": listed(self.absorption_area_m2),
            "speed_of_sound_m_s": self.speed_of_sound,
            "air_m_per_m": listed(self.air_m_per_m),
            "target": None
            if target is None
            else {
                "low": listed(target.low),
                "aim": listed(target.aim),
                "high": listed(target.high),
                "name": target.name,
                "source": target.source,
                "edition": target.edition,
                "basis": target.basis,
                "condition": target.condition,
            },
            "inside_probability": listed(self.inside),
            "probability": self.probability,
            "schroeder_hz": self.schroeder_hz,
            "volume_m3": self.volume_m3,
            "surface_m2": self.surface_m2,
            "assumed_hz": list(self.assumed_hz),
            "capped": self.capped,
            "contributions": {name: listed(share) for name, share in self.contributions.items()},
            "largest_contribution": main_input,
            "balance": {name: listed([value])[0] for name, value in self.balance.items()},
            "verdicts": list(self.verdicts),
            "warnings": list(self.warnings),
        }


def predict(
    surfaces: RoomSurfaces,
    air: Air,
    target: TargetLimits | None = None,
    *,
    methods: Sequence[str] = METHODS,
    formula: str = "eyring",
    draws: int = DRAWS,
    seed: int = 1,
) -> Prediction:
    """Reverberation time of a room per octave, with its interval and its target.

    Parameters
    ----------
    surfaces
        The room, untreated or treated.
    air
        State of the air.
    target
        Limits to judge it by.
    methods
        Formulas to evaluate, of `planner.predict.formulas.METHODS`.
    formula
        The one that interval and verdict belong to; evaluated in any case.
    draws
        Variants behind the interval; 0 leaves it out (NaN).
    seed
        Of those variants.
    """
    room = inputs_of(surfaces, air)
    names = [*methods] if formula in methods else [*methods, formula]
    times = {name: reverberation_time(name, room) for name in names}
    middle = float(times[formula][_MIDDLE].mean())
    schroeder = float(schroeder_frequency(middle, room.volume))
    blank = np.full(len(OCTAVES), np.nan)
    prediction = Prediction(
        methods=times,
        formula=formula,
        u_s=blank,
        interval_s=np.array([blank, blank]),
        absorption_area_m2=surfaces.absorption_area,
        speed_of_sound=float(room.speed),
        air_m_per_m=room.air_attenuation,
        volume_m3=surfaces.volume,
        surface_m2=surfaces.surface_area,
        schroeder_hz=schroeder,
        assumed_hz=surfaces.assumed_hz,
        capped=int(np.sum(surfaces.alpha > LARGEST_ALPHA)),
        contributions={},
        target=target,
    )
    if draws:
        prediction = _with_interval(prediction, surfaces, air, draws, seed)
    notes = (*doubts(prediction, surfaces, room), *(target.warnings if target else ()))
    return replace(prediction, warnings=notes)


def with_method(prediction: Prediction, name: str, times: Array) -> Prediction:
    """The prediction with one more way of finding the time, such as ``simulated``."""
    return replace(prediction, methods={**prediction.methods, name: times})


def _with_interval(
    prediction: Prediction, surfaces: RoomSurfaces, air: Air, count: int, seed: int
) -> Prediction:
    variants = draw(surfaces, air, count, seed)
    times = reverberation_time(prediction.formula, variants.room)
    finite = np.where(np.isfinite(times), times, np.nan)
    inside, probability = prediction.inside, None
    if prediction.target is not None:
        missed = outside_limits(times, prediction.target)
        inside = np.where(prediction.target.judged, 1.0 - missed.mean(axis=0), np.nan)
        if prediction.judged.any():
            probability = float(1.0 - missed[:, prediction.judged].any(axis=1).mean())
    return replace(
        prediction,
        u_s=np.std(finite, axis=0, ddof=1),
        interval_s=np.quantile(times, [0.025, 0.975], axis=0),
        contributions=contributions(times, variants.factors),
        inside=inside,
        probability=probability,
    )


def outside_limits(times: Array, target: TargetLimits) -> NDArray[np.bool_]:
    """Where a time lies outside a target, shape of `times`; never where the target is silent."""
    with np.errstate(invalid="ignore"):
        return np.asarray((times < target.low) | (times > target.high), bool)


def listed(values: Sequence[float] | Array) -> list[float | None]:
    """Numbers for JSON: None where one is missing or infinite."""
    return [float(value) if np.isfinite(value) else None for value in values]


def in_words(probability: float) -> str:
    """A probability of being inside the target, as a practitioner would say it."""
    if probability >= 0.8:
        return "likely"
    return "unclear" if probability >= 0.2 else "unlikely"


def _largest(shares: dict[str, Array]) -> list[str | None]:
    """The input that contributes most, band by band."""
    if not shares:
        return [None] * len(OCTAVES)
    names = list(shares)
    table = np.array([shares[name] for name in names])
    return [names[row] for row in table.argmax(axis=0)]


def _excess(seconds: float) -> str:
    """How far beyond a limit, in words that never say nought."""
    return f"{seconds:.2f} s" if seconds >= 0.005 else "less than 0.01 s"


def _verdicts(prediction: Prediction) -> list[str]:
    target = prediction.target
    if target is None:
        return []
    lines = []
    for direction, beyond in (
        ("too long", prediction.time > target.high),
        ("too short", prediction.time < target.low),
    ):
        parts = [
            f"{hz} Hz by {_excess(abs(t - limit))}"
            for hz, t, limit, out, judged in zip(
                OCTAVES,
                prediction.time,
                target.high if direction == "too long" else target.low,
                beyond,
                prediction.judged,
                strict=True,
            )
            if out and judged
        ]
        if parts:
            lines.append(f"Outside the target, {direction}: {', '.join(parts)}.")
    if not lines and prediction.judged.any():
        lines.append("Inside the target in every judged band, as far as the coefficients hold.")
    skipped = [
        str(hz)
        for hz, limited, judged in zip(OCTAVES, target.judged, prediction.judged, strict=True)
        if limited and not judged
    ]
    if skipped:
        lines.append(
            f"Not judged, since they rest on assumed coefficients: {', '.join(skipped)} Hz."
        )
    if prediction.probability is not None:
        lines.append(
            f"Probability of meeting it in all judged bands: {prediction.probability:.0%} "
            f"({in_words(prediction.probability)})."
        )
    return lines
