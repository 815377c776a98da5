"""Sections on how the room sounds: prediction, modes, measurement, what explains the difference."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.measure.figures import doubts_in_words
from planner.report import charts
from planner.report.acceptance import interval_text, limits_text
from planner.report.document import Builder, Section
from planner.report.quantities import NONE, Quantities, seconds
from planner.report.report_data import Measurement, ReportData, band_heads

FORMULA_NAMES = {
    "sabine": "Sabine",
    "eyring": "Eyring",
    "millington_sette": "Millington-Sette",
    "kuttruff": "Kuttruff",
    "fitzroy": "Fitzroy",
    "arau_puchades": "Arau-Puchades",
    "simulated": "simulation",
}
MOST_MODES = 30


def prediction_sections(data: ReportData) -> list[Section]:
    """Reverberation time by every formula, with its interval and what it hangs on."""
    prediction = data.prediction
    if prediction is None:
        return []
    builder = Builder()
    low, high = np.asarray(prediction.interval_s, float)
    name = FORMULA_NAMES.get(prediction.formula, prediction.formula)
    interval = charts.Series(f"{name}, as described", prediction.time, "untreated", low, high,
                             "95 % interval of the prediction", prediction.assumed_hz)  # fmt: skip
    builder.chart(
        charts.reverberation([interval], data.target, title="Predicted reverberation time")
    )
    rows = [
        (FORMULA_NAMES.get(key, key), *(seconds(value) for value in np.asarray(values, float)))
        for key, values in prediction.methods.items()
    ]
    rows.append(("95 % interval, from", *(seconds(value) for value in low)))
    rows.append(("95 % interval, to", *(seconds(value) for value in high)))
    if data.target is not None:
        rows.append(
            (
                "target",
                *(
                    limits_text(float(a), float(b))
                    for a, b in zip(data.target.low, data.target.high, strict=True)
                ),
            )
        )
    builder.table(("T (s) by", *band_heads()), rows, right=tuple(range(1, 9)), wide=0, small=True)
    show = Quantities(data.units)
    area = [show.area(float(value)) for value in prediction.absorption_area_m2]
    builder.table(
        ("absorption area", *band_heads()),
        [("surfaces and furnishings", *area)],
        right=tuple(range(1, 9)),
        wide=0,
        small=True,
    )
    facts = f"Schroeder frequency {prediction.schroeder_hz:.0f} Hz: below it single modes decide and a reverberation time says little. Speed of sound {show.speed(prediction.speed_of_sound)}."
    builder.words(facts)
    if prediction.contributions:
        builder.words(
            f"At 500 Hz the uncertainty comes from: {_largest(prediction.contributions, OCTAVES.index(500))}."
        )
    builder.bullets(prediction.verdicts, "Against the target")
    builder.bullets(prediction.warnings, "Doubts")
    return builder.section("Prediction")


def _largest(contributions: dict[str, NDArray[Any]], band: int) -> str:
    shares = sorted(
        ((float(v[band]), k) for k, v in contributions.items() if np.isfinite(v[band])),
        reverse=True,
    )
    return ", ".join(f"{name} {100 * share:.0f} %" for share, name in shares[:4])


def mode_sections(data: ReportData) -> list[Section]:
    """The lowest modes and how many lie in each third octave."""
    modes = data.modes
    if modes is None:
        return []
    builder = Builder().chart(
        charts.modes(modes.hz, modes.kinds, modes.labels, schroeder_hz=modes.schroeder_hz)
    )
    if modes.third_octave_count:
        builder.chart(charts.mode_count(modes.third_octaves_hz, modes.third_octave_count))
    rows = [
        (
            modes.labels[n],
            f"{modes.hz[n]:.1f}",
            modes.kinds[n],
            NONE if modes.t_s is None else seconds(float(modes.t_s[n])),
        )
        for n in range(min(len(modes.hz), MOST_MODES))
    ]
    caption = f"The lowest {len(rows)} of {len(modes.hz)} modes"
    builder.table(
        ("mode", "Hz", "kind", "decay time (s)"),
        rows,
        right=(1, 3),
        wide=-1,
        caption=caption,
        small=True,
    )
    return builder.section("Room modes")


def measurement_sections(data: ReportData) -> list[Section]:
    """What was measured, how well, and in which grade."""
    measured = data.measurement
    if measured is None:
        return []
    builder = Builder()
    reach = 1.96 * np.asarray(measured.u_s, float)
    times = np.asarray(measured.t_s, float)
    if tuple(measured.bands_hz) == OCTAVES:
        shown = [
            charts.Series(
                "Measured",
                times,
                "measured",
                times - reach,
                times + reach,
                "95 % interval of the measurement",
            )
        ]
        chart = charts.reverberation(shown, data.target, title="Measured reverberation time")
        if data.comparison is not None:
            predicted = charts.Series(
                "Predicted",
                data.comparison.predicted,
                "untreated",
                assumed_hz=data.comparison.assumed_hz,
            )
            chart = charts.measured_against_predicted(predicted, shown[0], data.target)
        builder.chart(chart)
    facts = [
        ("State of the room", measured.state),
        ("Date", measured.date),
        ("Positions and decays", measured.positions),
        ("Grade", measured.grade),
    ]
    builder.table(("what", "value"), [fact for fact in facts if fact[1]], wide=1)
    builder.table(
        ("band", "T (s)", "95 % interval (s)", "evaluation", "decay range (dB)"),
        _measured_rows(measured),
        right=(1, 2, 4),
        wide=3,
        small=True,
    )
    if measured.flags:
        builder.bullets(doubts_in_words(measured.bands_hz, measured.flags), "Doubts about bands")
    builder.bullets(measured.warnings, "Remarks on the recordings")
    if data.comparison is not None:
        builder.bullets(data.comparison.words, "Against the prediction")
        builder.bullets(data.comparison.warnings, "Doubts")
    return builder.section("Measurement")


def _measured_rows(measured: Measurement) -> list[tuple[str, ...]]:
    rows: list[tuple[str, ...]] = []
    for n, hz in enumerate(measured.bands_hz):
        time, reach = float(measured.t_s[n]), 1.96 * float(measured.u_s[n])
        span = NONE if measured.range_db is None else seconds(float(measured.range_db[n]), 0)
        rows.append(
            (
                f"{hz:g} Hz",
                seconds(time),
                interval_text(time - reach, time + reach),
                measured.evaluation[n] if n < len(measured.evaluation) else "",
                span,
            )
        )
    return rows


def calibration_sections(data: ReportData) -> list[Section]:
    """Which coefficients explain the measurement."""
    builder = Builder().words(
        *(
            [
                "The coefficients below were changed as little as the measurement asks for, within their uncertainty."
            ]
            if data.calibrated or data.calibration_words
            else []
        )
    )
    builder.bullets(data.calibration_words)
    builder.table(
        ("material", "band", "assumed", "fits the measurement"),
        data.calibrated,
        right=(2, 3),
        wide=-1,
        small=True,
    )
    return builder.section("Calibration: what the measurement says about the surfaces")
