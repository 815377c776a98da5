"""Proportions of a room to be built: published criteria with their numbers, and a search."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.errors import RoomError
from planner.predict.modes import (
    coincidences,
    rectangular_modes,
    spacing_index,
    third_octave_count,
)

Array = NDArray[np.float64]

MOST_TRIED = 40_000
"""Sizes that a search looks at. [-]"""

SCORED_MODES = 40
"""Lowest modes that the score counts. [-]"""

PUBLISHED_RATIOS: tuple[tuple[str, tuple[float, float], str], ...] = (
    ("1 : 1.26 : 1.59", (1.26, 1.59), "Bolt; seen in a public text"),
    ("1 : 1.14 : 1.39", (1.14, 1.39), "Sepmeyer, from memory; texts disagree about the name"),
    ("1 : 1.28 : 1.54", (1.28, 1.54), "Sepmeyer, from memory; texts disagree about the name"),
    ("1 : 1.60 : 2.33", (1.60, 2.33), "Sepmeyer, from memory; texts disagree about the name"),
    ("1 : 1.4 : 1.9", (1.4, 1.9), "Louden, from memory"),
    ("1 : 1.3 : 1.9", (1.3, 1.9), "Louden, from memory"),
    ("1 : 1.5 : 2.5", (1.5, 2.5), "Louden, from memory"),
)
"""Published proportions, height first; how well each is known."""


@dataclass(frozen=True, slots=True)
class Criterion:
    """One published criterion, judged."""

    name: str
    holds: bool
    numbers: str
    """What was compared."""
    source: str


def criteria(dimensions: ArrayLike, *, speed_of_sound: float = 343.0) -> list[Criterion]:
    """Published criteria for the proportions of a rectangular room, with their numbers."""
    size = np.sort(np.asarray(dimensions, float))
    height = float(np.asarray(dimensions, float)[2])
    width, length = sorted(float(x) for x in np.asarray(dimensions, float)[:2])
    hz, _ = rectangular_modes(size, 200.0, speed_of_sound=speed_of_sound)
    bands, count = third_octave_count(hz, 200.0)
    return [
        _inequality(length, width, height),
        _no_whole_numbers(length, width, height),
        _growing_count(bands, count),
        _crowded_coincidences(hz, bands, count),
        _nearest_ratio(size),
    ]


def _inequality(length: float, width: float, height: float) -> Criterion:
    low, ratio, high = 1.1 * width / height, length / height, 4.5 * width / height - 4.0
    holds = low <= ratio <= high and length < 3 * height and width < 3 * height
    return Criterion(
        "length within 1.1 w/h and 4.5 w/h − 4, both under 3 h",
        holds,
        f"{low:.2f} ≤ l/h = {ratio:.2f} ≤ {high:.2f}",
        "Walker, BBC RD 1993/8; EBU Tech 3276, ITU-R BS.1116 (from memory)",
    )


def _no_whole_numbers(length: float, width: float, height: float) -> Criterion:
    ratios = {"l/h": length / height, "w/h": width / height, "l/w": length / width}
    near = [f"{k} = {r:.2f}" for k, r in ratios.items() if abs(r - round(r)) <= 0.05 * round(r)]
    return Criterion(
        "no two dimensions within 5 % of a whole-number ratio",
        not near,
        ", ".join(near) or ", ".join(f"{k} = {r:.2f}" for k, r in ratios.items()),
        "EBU Tech 3276 (from memory)",
    )


def _growing_count(bands: tuple[float, ...], count: Array) -> Criterion:
    falls = [f"{bands[n + 1]:g} Hz" for n in np.flatnonzero(np.diff(count) < 0)]
    return Criterion(
        "modes per one-third octave never decrease with frequency",
        not falls,
        f"fewer than below at {', '.join(falls)}" if falls else "none decreases",
        "Bonello, JAES 29 (1981) 597 (from memory)",
    )


def _crowded_coincidences(hz: Array, bands: tuple[float, ...], count: Array) -> Criterion:
    bad = []
    for one, other in coincidences(hz, 0.001):
        band = int(np.argmin(np.abs(np.log(np.array(bands) / hz[one]))))
        if count[band] < 5:
            bad.append(f"{hz[one]:.1f} and {hz[other]:.1f} Hz")
    return Criterion(
        "modes fall together only where a one-third octave holds five or more",
        not bad,
        "; ".join(bad[:4]) or "no such pair",
        "Bonello, JAES 29 (1981) 597 (from memory)",
    )


def _nearest_ratio(size: Array) -> Criterion:
    ours = size[1:] / size[0]
    off = [float(np.max(np.abs(np.array(r) / ours - 1.0))) for _, r, _ in PUBLISHED_RATIOS]
    best = int(np.argmin(off))
    name, _, source = PUBLISHED_RATIOS[best]
    return Criterion(
        "near a published proportion (within 5 %)",
        off[best] <= 0.05,
        f"1 : {ours[0]:.2f} : {ours[1]:.2f}; nearest {name}, off by {off[best]:.0%}",
        source,
    )


@dataclass(frozen=True, slots=True)
class Candidate:
    """A size of room and how its modes are spread."""

    dimensions: tuple[float, float, float]
    """[m]"""
    score: float
    """Spacing index of the lowest modes: 1 is perfectly even. [-]"""
    largest_gap_hz: float
    """Largest distance between neighbours among them. [Hz]"""
    coincident: int
    """Pairs within 5 % of each other among the lowest twenty."""

    def to_json(self) -> dict[str, Any]:
        """For ``planner modes --vary --json``."""
        return {
            "length_m": self.dimensions[0],
            "width_m": self.dimensions[1],
            "height_m": self.dimensions[2],
            "score": self.score,
            "largest_gap_hz": self.largest_gap_hz,
            "coincident": self.coincident,
        }

    @property
    def reason(self) -> str:
        """The score in words."""
        return (
            f"spacing index {self.score:.2f} (1 is even), largest gap {self.largest_gap_hz:.1f} Hz, "
            f"{self.coincident} of the lowest twenty modes within 5 % of a neighbour"
        )


def rated(dimensions: ArrayLike, *, speed_of_sound: float = 343.0) -> list[Candidate]:
    """Score of one or many sizes, shape ``(..., 3)``, in their order.

    The score looks at the lowest `SCORED_MODES` modes of each size: those a listener can tell
    apart.
    """
    sizes = np.atleast_2d(np.asarray(dimensions, float))
    orders = np.stack(np.meshgrid(*[np.arange(9)] * 3, indexing="ij"), -1).reshape(-1, 3)[1:]
    found = []
    for chunk in np.array_split(sizes, max(len(sizes) // 2000, 1)):
        squared = np.einsum("mi,si->sm", (orders**2).astype(float), chunk**-2.0)
        lowest = np.partition(squared, SCORED_MODES - 1, axis=1)[:, :SCORED_MODES]
        hz = 0.5 * speed_of_sound * np.sqrt(np.sort(lowest, axis=1))
        score = spacing_index(hz)
        gap = np.diff(hz, axis=1).max(axis=1)
        close = (np.diff(hz[:, :20], axis=1) <= 0.05 * hz[:, :19]).sum(axis=1)
        found += [
            Candidate((float(s[0]), float(s[1]), float(s[2])), float(a), float(b), int(c))
            for s, a, b, c in zip(chunk, score, gap, close, strict=True)
        ]
    return found


def search(
    length: tuple[float, float],
    width: tuple[float, float],
    height: tuple[float, float],
    *,
    step: float = 0.05,
    best: int = 5,
    speed_of_sound: float = 343.0,
) -> list[Candidate]:
    """Sizes within what a site allows whose modes are spread best.

    Parameters
    ----------
    length, width, height
        Least and largest. [m]
    step
        Of the search; widened where there would be more than `MOST_TRIED` sizes. [m]
    best
        How many to give, best first; neighbours closer than three steps are left out. [-]

    Raises
    ------
    RoomError
        A range that is empty or absurd.
    """
    for name, (low, high) in (("length", length), ("width", width), ("height", height)):
        if not 0.5 <= low <= high <= 60.0:
            raise RoomError(
                f"a {name} from {low:g} to {high:g} m is no range to build in",
                cure="Give the smaller first, in metres.",
            )
    spans = [high - low for low, high in (length, width, height)]
    while np.prod([int(span / step) + 1 for span in spans]) > MOST_TRIED:
        step *= 1.25
    axes = [
        np.linspace(low, high, round((high - low) / step) + 1)
        for low, high in (length, width, height)
    ]
    sizes = np.stack(np.meshgrid(*axes, indexing="ij"), -1).reshape(-1, 3)
    ranked = sorted(rated(sizes, speed_of_sound=speed_of_sound), key=lambda one: one.score)
    kept: list[Candidate] = []
    for one in ranked:
        apart = [
            np.max(np.abs(np.subtract(one.dimensions, other.dimensions))) >= 3 * step
            for other in kept
        ]
        if all(apart):
            kept.append(one)
        if len(kept) == best:
            break
    return kept
