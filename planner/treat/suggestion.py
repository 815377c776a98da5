"""What the optimiser answers: the list, what it does, how sure that is, and why not more."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.treat.option import Option

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class SuggestedItem:
    """So many of one product on one surface."""

    product: str
    description: str
    surface: str
    count: int | None
    """Pieces; None for goods by the square metre."""
    area_m2: float
    """Surface that is covered. [m²]"""


@dataclass(frozen=True, slots=True)
class ShortBand:
    """A band that stays outside the target, and why."""

    band_hz: int
    side: str
    """``too long`` or ``too short``."""
    missing_m2: float
    """Absorption area that the room as it is lacks; negative: has too much. [m²]"""
    largest_possible_m2: float
    """The most that the limits let the products add (too long), or the least (too short). [m²]"""
    short_by_m2: float
    """What is still missing, or too much, with the suggested list. [m²]"""
    reached_s: float
    """Reverberation time with the suggested list. [s]"""
    limit_s: float
    """The target's limit on that side. [s]"""


@dataclass(frozen=True, slots=True)
class Relaxation:
    """A limit that, given up so far and no further, lets the target be met."""

    limit: str
    """``budget``, ``area``, ``weight``, ``products``, ``keep_clear``, ``target`` …"""
    where: str
    """Surface or band it is about; empty where it is about neither."""
    amount: float | None
    """How far, in `unit`; None where it is given up whole."""
    unit: str
    says: str
    """The advice in words."""
    cost: float | None = None
    """Of the list that then meets the target, where it was worked out."""


@dataclass(frozen=True, slots=True)
class Opinion:
    """What another way of predicting says of the list."""

    method: str
    reverberation_time: Array
    """Shape ``(band,)``. [s]"""
    outside_hz: tuple[int, ...]
    """Judged bands in which it sees the target missed. [Hz]"""


@dataclass(frozen=True, slots=True)
class SecondOpinion:
    """The suggested list run through other formulas, and what follows."""

    opinions: tuple[Opinion, ...]
    agrees: bool
    says: str
    corrected: Suggestion | None = None
    """A list on which all agree, where one was found and the first is not one."""


@dataclass(frozen=True, slots=True)
class Suggestion:
    """The cheapest treatment inside the target, or the one that comes closest."""

    status: str
    """``optimal``, ``infeasible`` or ``time-limit``."""
    option: Option
    items: tuple[SuggestedItem, ...]
    cost: float
    """Of whole packs; the area bought where nothing has a price. [currency] or [m²]"""
    currency: str
    """``m2`` where nothing has a price."""
    predicted: Array
    """By the formula that must meet the target (Eyring's for both), shape ``(band,)``. [s]"""
    methods: dict[str, Array]
    """By every formula asked for. [s]"""
    untreated: Array
    """The room as it is, by the same formula as `predicted`. [s]"""
    target_low: Array
    """[s], NaN where there is no limit."""
    target_high: Array
    """[s], NaN where there is no limit."""
    judged_hz: tuple[int, ...]
    """Bands that decided. [Hz]"""
    assumed_hz: tuple[int, ...]
    """Bands with coefficients that no source gives. [Hz]"""
    probability: float
    """That all judged bands lie inside the target. [-]"""
    band_probability: Array
    """The same band by band, 1 where not judged. [-]"""
    confidence: float | None
    """Probability that was asked for. [-]"""
    gap: float
    """Proven: no list is cheaper by more than this share; with a confidence, none that keeps the
    margins which reach it. [-]"""
    deviation_s: float
    """Farthest that a judged band lies outside its limits. [s]"""
    short_bands: tuple[ShortBand, ...] = ()
    binding: tuple[str, ...] = ()
    """Limits that this list uses up."""
    relaxations: tuple[Relaxation, ...] = ()
    warnings: tuple[str, ...] = ()
    second_opinion: SecondOpinion | None = None
    seconds: float = field(default=0.0, compare=False)
    """Time taken. [s]"""

    @property
    def meets_target(self) -> bool:
        """Inside the target in every judged band, by the formulas that must meet it."""
        return self.deviation_s == 0.0

    def to_json(self) -> dict[str, Any]:
        """As promised for ``planner suggest --json``; nothing but finite numbers, None, text."""
        second = self.second_opinion
        return {
            "status": self.status,
            "items": [
                {
                    "product": item.product,
                    "description": item.description,
                    "surface": item.surface,
                    "count": item.count,
                    "area_m2": _rounded(item.area_m2, 4),
                }
                for item in self.items
            ],
            "cost": _rounded(self.cost, 2),
            "currency": self.currency,
            "bands_hz": list(OCTAVES),
            "predicted": _list(self.predicted),
            "methods": {name: _list(values) for name, values in self.methods.items()},
            "untreated": _list(self.untreated),
            "target": {"low": _list(self.target_low), "high": _list(self.target_high)},
            "judged_hz": list(self.judged_hz),
            "assumed_hz": list(self.assumed_hz),
            "probability": _rounded(self.probability, 4),
            "band_probability": _list(self.band_probability),
            "confidence": self.confidence,
            "gap": _rounded(self.gap, 6),
            "deviation_s": _rounded(self.deviation_s, 4),
            "short_bands": [
                {
                    "band_hz": band.band_hz,
                    "side": band.side,
                    "missing_m2": _rounded(band.missing_m2, 3),
                    "largest_possible_m2": _rounded(band.largest_possible_m2, 3),
                    "short_by_m2": _rounded(band.short_by_m2, 3),
                    "reached_s": _rounded(band.reached_s, 4),
                    "limit_s": _rounded(band.limit_s, 4),
                }
                for band in self.short_bands
            ],
            "binding": list(self.binding),
            "relaxations": [
                {
                    "limit": relaxation.limit,
                    "where": relaxation.where,
                    "amount": _rounded(relaxation.amount, 4),
                    "unit": relaxation.unit,
                    "says": relaxation.says,
                    "cost": _rounded(relaxation.cost, 2),
                }
                for relaxation in self.relaxations
            ],
            "second_opinion": None
            if second is None
            else {
                "agrees": second.agrees,
                "says": second.says,
                "methods": {o.method: _list(o.reverberation_time) for o in second.opinions},
                "outside_hz": {o.method: list(o.outside_hz) for o in second.opinions},
                "corrected": None if second.corrected is None else second.corrected.to_json(),
            },
            "warnings": list(self.warnings),
        }


def _rounded(value: float | None, digits: int) -> float | None:
    if value is None or not math.isfinite(value):
        return None
    return round(float(value), digits) + 0.0  # no −0.0


def _list(values: Array) -> list[float | None]:
    return [_rounded(float(value), 4) for value in values]
