"""The first page: what a client wants to know, in plain words, with no verdict without its doubt."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.report import charts
from planner.report.acceptance import limits_text
from planner.report.document import Builder, Section
from planner.report.quantities import money, seconds
from planner.report.report_data import Array, ReportData

SPEECH = (500, 1000)
"""Bands whose mean stands for the room in a sentence. [Hz]"""


def client_page(data: ReportData) -> list[Section]:
    """Now, after, target, cost, and what it will not do."""
    builder = Builder()
    now, after = now_times(data), after_times(data)
    builder.words(*_sentences(data, now, after))
    if now is not None:
        series = [charts.Series("Now", now, "untreated", assumed_hz=now_assumed(data))]
        if after is not None:
            series.append(
                charts.Series("After treatment", after, "option-a", assumed_hz=after_assumed(data))
            )
        chart = charts.reverberation(
            series, data.target, title="How long the room rings", height=165
        )
        builder.chart(chart)
    builder.table(("octave band", "now (s)", "after (s)", "target (s)"), _rows(data, now, after),
                  right=(1, 2, 3), wide=-1)  # fmt: skip
    builder.bullets(
        (
            "It does not keep sound in or out: treatment makes a room ring less, it does not stop "
            "noise through walls, doors and windows.",
            "It does not move the lowest bass by much: below about "
            f"{_schroeder(data)} single room modes decide, and loudspeaker and seat matter as much.",
            "It is an estimate until it has been measured again after fitting.",
        ),
        "What it will not do",
    )
    return builder.section("In short")


def now_times(data: ReportData) -> Array | None:
    """Measured where there is a measurement in octaves, else predicted. [s]."""
    predicted = None if data.prediction is None else np.asarray(data.prediction.time, float)
    if data.measurement is None or not is_measured(data).any():
        return predicted
    times = np.asarray(data.measurement.t_s, float)
    return times if predicted is None else np.where(np.isfinite(times), times, predicted)


def is_measured(data: ReportData) -> NDArray[np.bool_]:
    """Octaves whose time now was measured, shape ``(band,)``."""
    measured = data.measurement
    if measured is None or tuple(measured.bands_hz) != OCTAVES:
        return np.zeros(len(OCTAVES), bool)
    known: NDArray[np.bool_] = np.isfinite(np.asarray(measured.t_s, float))
    return known


def now_assumed(data: ReportData) -> tuple[int, ...]:
    """Octaves whose time now rests on an assumption. [Hz]."""
    if data.prediction is None:
        return ()
    known = dict(zip(OCTAVES, is_measured(data), strict=True))
    return tuple(hz for hz in data.prediction.assumed_hz if not known[hz])


def after_assumed(data: ReportData) -> tuple[int, ...]:
    """Octaves whose time after treatment rests on an assumption. [Hz]."""
    if data.after is not None:
        return tuple(data.after.assumed_hz)
    return () if data.suggestion is None else tuple(data.suggestion.assumed_hz)


def after_times(data: ReportData) -> Array | None:
    """Predicted for the treated room. [s]."""
    if data.after is not None:
        return np.asarray(data.after.time, float)
    return None if data.suggestion is None else np.asarray(data.suggestion.predicted, float)


def middle(times: Array) -> float:
    """Mean of 500 Hz and 1 kHz. [s]."""
    return float(np.mean([times[OCTAVES.index(hz)] for hz in SPEECH]))


def _sentences(data: ReportData, now: Array | None, after: Array | None) -> list[str]:
    said = []
    if now is not None:
        how = (
            "measured"
            if is_measured(data)[[OCTAVES.index(hz) for hz in SPEECH]].all()
            else "predicted"
        )
        said.append(
            f"Now: speech in this room rings for {middle(now):.2f} s ({how}, mean of 500 Hz and 1 kHz)."
        )
    if data.target is not None:
        low, high = (np.asarray(limits, float) for limits in (data.target.low, data.target.high))
        at = OCTAVES.index(500)
        words = limits_text(low[at], high[at])
        said.append(f"Target: {data.target.description or data.target.name}; {words} s at 500 Hz.")
    if after is not None:
        doubt = _doubt(data)
        said.append(
            f"After: {middle(after):.2f} s is predicted with {data.treatment_name or 'the treatment'}{doubt}."
        )
    if data.buying is not None and data.buying.total is not None:
        incomplete = "" if data.buying.is_complete else ", not counting what has no price yet"
        said.append(
            f"Cost: {money(data.buying.total, data.buying.currency)} for whole packs{incomplete}."
        )
    elif data.suggestion is not None and data.suggestion.currency != "m2":
        said.append(
            f"Cost: {money(data.suggestion.cost, data.suggestion.currency)} for whole packs."
        )
    if data.acceptance is not None:
        said.append(f"Measured again after fitting: {data.acceptance.sentence}")
    return said


def _doubt(data: ReportData) -> str:
    probability = None
    if data.after is not None:
        probability = data.after.probability
    if probability is None and data.suggestion is not None:
        probability = data.suggestion.probability
    if probability is None or data.target is None:
        return ""
    word = "likely" if probability >= 0.8 else "unlikely" if probability < 0.3 else "not certain"
    return (
        f"; that it meets the target in every judged band is {word} "
        f"(probability {100 * probability:.0f} %)"
    )


def _rows(data: ReportData, now: Array | None, after: Array | None) -> list[tuple[str, ...]]:
    if now is None and after is None:
        return []
    measured = is_measured(data)
    rows: list[tuple[str, ...]] = []
    for n, hz in enumerate(OCTAVES):
        limits = "–"
        if data.target is not None:
            limits = limits_text(float(data.target.low[n]), float(data.target.high[n]))
        before, treated = (seconds(None if one is None else one[n]) for one in (now, after))
        if hz in now_assumed(data):
            before += " (assumed)"
        elif measured.any() and not measured[n]:
            before += " (predicted)"
        if hz in after_assumed(data):
            treated += " (assumed)"
        rows.append((f"{hz} Hz", before, treated, limits))
    return rows


def _schroeder(data: ReportData) -> str:
    if data.prediction is not None and np.isfinite(data.prediction.schroeder_hz):
        return f"{data.prediction.schroeder_hz:.0f} Hz"
    return "200 Hz"
