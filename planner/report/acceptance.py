"""Was the job done: measured reverberation time against the target, band by band, with a verdict.

A verdict is decided by the interval of the measurement, never by its middle: met when the whole
interval lies inside the limits, not met when it lies outside, and otherwise it cannot be told.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from statistics import NormalDist
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.bands import OCTAVES
from planner.report import charts
from planner.report.document import Builder, Document, Section
from planner.report.quantities import NONE, seconds

if TYPE_CHECKING:
    from planner.predict.targets import TargetLimits

Array = NDArray[np.float64]

MET, NOT_MET, UNCLEAR = "met", "not met", "cannot be told"
SIGNS = {MET: "●", NOT_MET: "○", UNCLEAR: "◐", "": ""}
"""A sign beside each word, so that no verdict hangs on colour."""


@dataclass(frozen=True, slots=True)
class Acceptance:
    """Measured times judged against limits."""

    t_s: Array
    """Shape ``(band,)``, NaN where the measurement gives none. [s]"""
    low_s: Array
    """Lower end of the interval, ``(band,)``. [s]"""
    high_s: Array
    """[s]"""
    target_low: Array
    """[s], NaN where there is no limit."""
    target_high: Array
    """[s]"""
    verdicts: tuple[str, ...]
    """``met``, ``not met``, ``cannot be told``; empty where the target has no limit."""
    confidence: float
    """Of each interval. [-]"""

    @property
    def overall(self) -> str:
        """One band not met is not met; every judged band met is met; empty without a target."""
        said = [verdict for verdict in self.verdicts if verdict]
        if not said:
            return ""
        if NOT_MET in said:
            return NOT_MET
        return UNCLEAR if UNCLEAR in said else MET

    @property
    def sentence(self) -> str:
        """The verdict in words."""
        if not self.overall:
            return "There is no target to judge against."
        bands: dict[str, list[str]] = {}
        for hz, verdict in zip(OCTAVES, self.verdicts, strict=True):
            if verdict:
                bands.setdefault(verdict, []).append(f"{hz} Hz")
        if len(bands) == 1:
            listed = f"in every judged band ({', '.join(bands[self.overall])})"
            return (
                f"The target is {self.overall} {listed}."
                if self.overall != UNCLEAR
                else (f"Whether the target is met cannot be told {listed}.")
            )
        parts = [f"{verdict} at {', '.join(where)}" for verdict, where in bands.items()]
        return f"The target as a whole: {self.overall}. By band: {'; '.join(parts)}."


def judge(
    t_s: ArrayLike,
    u_s: ArrayLike,
    low: ArrayLike,
    high: ArrayLike,
    *,
    confidence: float = 0.95,
) -> Acceptance:
    """Judge measured times by their intervals.

    Parameters
    ----------
    t_s, u_s
        Measured time and its standard uncertainty, shape ``(band,)``; NaN where there is none. [s]
    low, high
        Limits, NaN where there is none, shape ``(band,)``. [s]
    confidence
        Probability that the interval behind a band's verdict holds the true time. [-]

    Raises
    ------
    ValueError
        A confidence that is not between 0 and 1.
    """
    if not 0.0 < confidence < 1.0:
        raise ValueError(f"a confidence of {confidence:g} is not between 0 and 1")
    time, u = np.asarray(t_s, float), np.asarray(u_s, float)
    lower, upper = np.asarray(low, float), np.asarray(high, float)
    reach = NormalDist().inv_cdf(0.5 + confidence / 2.0) * u
    verdicts = tuple(
        _verdict(*row) for row in zip(time - reach, time + reach, lower, upper, strict=True)
    )
    return Acceptance(time, time - reach, time + reach, lower, upper, verdicts, confidence)


def _verdict(lowest: float, highest: float, low: float, high: float) -> str:
    if np.isnan(low) and np.isnan(high):
        return ""
    if np.isnan(lowest) or np.isnan(highest):
        return UNCLEAR
    # A limit that is missing compares as False, which is what "no limit" means.
    if lowest > high or highest < low:
        return NOT_MET
    return UNCLEAR if lowest < low or highest > high else MET


def acceptance_sections(
    acceptance: Acceptance, target: TargetLimits | None, *, before: Any = None
) -> list[Section]:
    """The judgement as sections of a document; `before` are the times before treatment. [s]."""
    builder = Builder().words(acceptance.sentence, strong=True)
    percent = f"{100 * acceptance.confidence:.0f} %"
    series = [
        charts.Series(
            "Measured after treatment",
            acceptance.t_s,
            "measured",
            acceptance.low_s,
            acceptance.high_s,
            f"{percent} interval of the measurement",
        )
    ]
    if before is not None:
        series.insert(0, charts.Series("Measured before", before, "untreated"))
    builder.chart(charts.reverberation(series, target, title="Measured against the target"))
    rows = []
    limits = zip(acceptance.target_low, acceptance.target_high, strict=True)
    for n, (low, high) in enumerate(limits):
        verdict = acceptance.verdicts[n]
        rows.append(
            (
                f"{OCTAVES[n]} Hz",
                seconds(acceptance.t_s[n]),
                interval_text(acceptance.low_s[n], acceptance.high_s[n]),
                limits_text(low, high),
                f"{SIGNS[verdict]} {verdict}".strip() or "not judged",
            )
        )
    heads = ("octave band", "measured T (s)", f"{percent} interval (s)", "target (s)", "verdict")
    builder.table(heads, rows, right=(1, 2, 3), wide=4)
    builder.words(
        "A band is met when its whole interval lies inside the limits, not met when the whole "
        "interval lies outside, and cannot be told otherwise; then a better measurement (more "
        "positions, more decays) is needed. The confidence holds for each band by itself."
    )
    if target is not None:
        builder.words(f"Target: {target.description or target.name}; {target.citation}.")
    return builder.section("Acceptance")


def acceptance_document(
    acceptance: Acceptance,
    target: TargetLimits | None,
    *,
    room: str,
    facts: Sequence[tuple[str, str]] = (),
    before: Any = None,
    paper: str = "a4",
    date: str = "",
    timestamp: int = 0,
) -> Document:
    """The acceptance sheet: one page to sign.

    Parameters
    ----------
    acceptance
        From `judge`.
    target
        What was judged against.
    room
        Name of the room.
    facts
        Label and value of what belongs on the sheet: date, state of the room, positions.
    before
        Times before treatment, shape ``(band,)``. [s]
    paper, date, timestamp
        As in `Document`.
    """
    sections = acceptance_sections(acceptance, target, before=before)
    lines = Builder().table(
        ("what", "value"), [*facts, ("Measured by", ""), ("Accepted by, date", "")], wide=1
    )
    sections += lines.section("Measurement and signatures", level=2)
    return Document(
        title="Acceptance sheet",
        subtitle=" – ".join(part for part in (room, date) if part),
        sections=tuple(sections),
        paper=paper,
        date=date,
        timestamp=timestamp,
        footer=f"Acceptance sheet, {room}",
    )


def interval_text(low: float, high: float, digits: int = 2) -> str:
    """``0.28 to 0.34``, a dash where there is none."""
    if not (np.isfinite(low) and np.isfinite(high)):
        return NONE
    return f"{low:.{digits}f} to {high:.{digits}f}"


def limits_text(low: float, high: float, digits: int = 2) -> str:
    """``0.20 to 0.35``, ``up to 0.35``, ``from 0.20``, a dash without limits."""
    if np.isfinite(low) and np.isfinite(high):
        return f"{low:.{digits}f} to {high:.{digits}f}"
    if np.isfinite(high):
        return f"up to {high:.{digits}f}"
    return f"from {low:.{digits}f}" if np.isfinite(low) else NONE
