"""The words and the table that go with a chart over bands."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from planner.bands import OCTAVES
from planner.report.band_series import Series, TargetSteps, limits_of
from planner.report.chart import joined, numbers, shortened


def notes_on(series: Sequence[Series], target: TargetSteps | None) -> list[str]:
    """What the signs mean, in words under the heading."""
    notes = []
    if target is not None:
        notes.append(f"grey steps: target – {shortened(target.name, 90)}")
    predicted = dict.fromkeys(
        one.interval for one in series if one.low is not None and one.look != "measured"
    )
    notes += [f"pale bar: {words}" for words in predicted]
    notes += [
        f"thin line: {one.interval}"
        for one in series
        if one.low is not None and one.look == "measured"
    ]
    if any(one.assumed_hz for one in series):
        notes.append("hollow marker: assumed")
    return ["; ".join(notes)] if notes else []


def sentences(
    series: Sequence[Series], target: TargetSteps | None, bands_hz: Sequence[float], quantity: str
) -> list[str]:
    """What each series says: against the target, or in itself where there is none."""
    if target is None:
        return [_plain_sentence(one, bands_hz, quantity) for one in series]
    return [target_sentence(one, target, bands_hz) for one in series]


def _plain_sentence(one: Series, bands_hz: Sequence[float], quantity: str) -> str:
    values = one.array()
    known = np.flatnonzero(np.isfinite(values))
    if not known.size:
        return f"{one.name} has no value in any band."
    first, last = known[np.argmin(values[known])], known[np.argmax(values[known])]
    return (
        f"{quantity} of {one.name} is from {values[first]:.2f} s at {bands_hz[first]:g} Hz to "
        f"{values[last]:.2f} s at {bands_hz[last]:g} Hz."
    )


def target_sentence(one: Series, target: TargetSteps, bands_hz: Sequence[float] = OCTAVES) -> str:
    """Where a series is inside the target and by how much it misses elsewhere, as a sentence."""
    inside, unknown = [], []
    missed: dict[str, list[tuple[float, str]]] = {"long": [], "short": []}
    limits = zip(bands_hz, one.array(), *limits_of(target), strict=True)
    for hz, value, lower, upper in limits:
        label = f"{hz:g} Hz"
        if not (np.isfinite(lower) or np.isfinite(upper)):
            continue
        if not np.isfinite(value):
            unknown.append(label)
        elif value > upper:
            missed["long"].append((value - upper, label))
        elif value < lower:
            missed["short"].append((lower - value, label))
        else:
            inside.append(label)
    outside = [_missed(direction, entries) for direction, entries in missed.items() if entries]
    if not (inside or outside or unknown):
        return f"{one.name}: the target says nothing about these bands."
    if not (inside or outside):
        text = f"{one.name} has no value where the target has limits"
    elif not outside:
        text = f"{one.name} is inside the target in every band that has a value"
    elif inside:
        text = f"{one.name} is inside the target at {joined(inside)}; it is {joined(outside)}"
    else:
        text = f"{one.name} is outside the target: {joined(outside)}"
    if unknown and (inside or outside):
        text += f"; no value at {joined(unknown)}"
    assumed = [f"{hz:g} Hz" for hz in one.assumed_hz]
    return f"{text}{f' (assumed at {joined(assumed)})' if assumed else ''}."


def _missed(direction: str, entries: list[tuple[float, str]]) -> str:
    """``0.10 s too long at 63 Hz``, or the range of many bands in one phrase."""
    if len(entries) <= 3:
        return joined([f"{max(by, 0.005):.2f} s too {direction} at {hz}" for by, hz in entries])
    most, where = max(entries)
    bands = joined([hz for _, hz in entries])
    return f"too {direction} at {bands}, most at {where} (by {most:.2f} s)"


def columns_of(
    series: Sequence[Series],
    target: TargetSteps | None,
    bands_hz: Sequence[float],
    unit: str = "s",
) -> dict[str, Sequence[Any]]:
    """The numbers of a chart, by heading with unit."""
    columns: dict[str, Sequence[Any]] = {"band (Hz)": list(bands_hz)}
    for one in series:
        columns[f"{one.name} ({unit})"] = numbers(one.values, 3)
        if one.low is not None and one.high is not None:
            columns[f"{one.name}, {one.interval}, from ({unit})"] = numbers(one.low, 3)
            columns[f"{one.name}, {one.interval}, to ({unit})"] = numbers(one.high, 3)
        if one.assumed_hz:
            columns[f"{one.name}, basis"] = [
                "assumed" if hz in one.assumed_hz else "" for hz in bands_hz
            ]
    if target is not None:
        columns["target from (s)"] = numbers(target.low, 3)
        columns["target to (s)"] = numbers(target.high, 3)
    return columns
