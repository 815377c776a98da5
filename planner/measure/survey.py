"""Many recordings, one room: which positions they are, their average, and how sure that is."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.absorption.tables import read_table
from planner.errors import RecordingError
from planner.measure.figures import Decays

Array = NDArray[np.float64]

COLUMNS = ("file", "source_position", "microphone_position", "state", "kind", "note")
STATES = ("empty", "furnished", "occupied")
KINDS = ("interrupted", "impulse")

GRADES: tuple[tuple[str, int, int, int, int], ...] = (
    ("precision", 12, 2, 3, 3),
    ("engineering", 6, 2, 2, 2),
    ("survey", 2, 1, 2, 1),
)
"""Method; source-microphone pairs, source positions, microphone positions and decays per pair that
it needs at least (ISO 3382-2:2008, table 1, from memory)."""

_NAMED = re.compile(r"([A-Za-z]+)[-_ ]?(\d+)")


@dataclass(frozen=True, slots=True)
class Place:
    """What one file is a recording of."""

    file: str
    source: str
    microphone: str
    state: str = ""
    kind: str = "interrupted"
    note: str = ""

    @property
    def pair(self) -> tuple[str, str]:
        """Source and microphone position."""
        return self.source, self.microphone


def read_survey(path: str | Path) -> dict[str, Place]:
    """Read ``survey.csv``: which file is which pair of positions.

    Raises
    ------
    RecordingError
        A column is missing, a file is listed twice, a state or kind is unknown.
    """
    file = Path(path)
    places: dict[str, Place] = {}
    needed = ("file", "source_position", "microphone_position")
    for row in read_table(file, needed, kind=RecordingError):
        where = f"line {row.line}"
        name = row.text("file")
        if not name or "/" in name or "\\" in name:
            raise RecordingError(
                f"{name!r} is no file name",
                file=file,
                where=where,
                cure="Name a file in the same folder.",
            )
        if name in places:
            raise RecordingError(f"{name!r} is listed twice", file=file, where=where)
        state, kind = row.text("state").lower(), row.text("kind").lower() or "interrupted"
        for value, known, column in ((state, ("", *STATES), "state"), (kind, KINDS, "kind")):
            if value not in known:
                raise RecordingError(
                    f"{value!r} is not known",
                    file=file,
                    where=f"{where}, column {column}",
                    cure=f"Use {', '.join(word for word in known if word)}.",
                )
        source, microphone = row.text("source_position"), row.text("microphone_position")
        if not source or not microphone:
            raise RecordingError("a position is empty", file=file, where=where, cure="Name both.")
        places[name] = Place(name, source, microphone, state, kind, row.text("note"))
    return places


def place_by_name(file: str) -> Place:
    """Positions from a file name such as ``A2.wav`` or ``source-1_mic-3.flac``.

    A letter and a number are source and microphone; otherwise each file is a pair of its own.
    """
    stem = Path(file).stem
    numbers = re.findall(r"\d+", stem)
    match = _NAMED.fullmatch(stem)
    if match and len(match[1]) == 1:
        return Place(file, match[1].upper(), match[2])
    if len(numbers) == 2:
        return Place(file, numbers[0], numbers[1])
    return Place(file, "1", stem)


def grade(pairs: Sequence[tuple[str, str]], fewest_decays: int) -> tuple[str, str]:
    """Method of ISO 3382-2 that is reached, and what the next one needs, in words.

    Parameters
    ----------
    pairs
        Distinct pairs of source and microphone position.
    fewest_decays
        Decays of the pair with the fewest.
    """
    sources, microphones = {s for s, _ in pairs}, {m for _, m in pairs}
    have = (len(set(pairs)), len(sources), len(microphones), fewest_decays)
    words = ("pairs of positions", "source positions", "microphone positions", "decays per pair")
    missing = ""
    for name, *needed in GRADES:
        short = [
            f"{need} {word} (there are {there})"
            for need, there, word in zip(needed, have, words, strict=True)
            if there < need
        ]
        if not short:
            return name, missing
        missing = f"For the {name} method of ISO 3382-2: {', '.join(short)}."
    return "", missing


@dataclass(frozen=True, slots=True)
class Average:
    """One room from several positions, shape ``(band,)`` each."""

    t_s: Array
    u_s: Array
    evaluation: tuple[str, ...]
    t20_s: Array
    t30_s: Array
    edt_s: Array
    range_db: Array
    positions: tuple[int, ...]
    decays: tuple[int, ...]
    flags: tuple[tuple[str, ...], ...]


def iso_uncertainty(
    time: Array, width: Array, pairs: Array, decays: Array, evaluation: str
) -> Array:
    """Standard deviation of T20 or T30 by interrupted noise, after ISO 3382-2:2008, annex A.

    Parameters
    ----------
    time, width
        Reverberation time [s] and bandwidth [Hz], shape ``(band,)``.
    pairs, decays
        Independent positions N and decays per position n, shape ``(band,)``.
    evaluation
        ``t20`` (also for shorter ranges) or ``t30`` (also for the whole decay).

    Notes
    -----
    s(T20) = 0.88 T sqrt((1 + 1.90/n) / (N B T)), s(T30) = 0.55 T sqrt((1 + 1.52/n) / (N B T)), from
    memory. [s]
    """
    factor, share = (0.55, 1.52) if evaluation in ("t30", "whole-decay") else (0.88, 1.90)
    with np.errstate(divide="ignore", invalid="ignore"):
        relative = factor * np.sqrt((1.0 + share / decays) / (pairs * width * time))
    return time * relative


def average(positions: Mapping[tuple[str, str], Decays]) -> Average:
    """Arithmetic mean of the reverberation times of all positions, band by band.

    The standard uncertainty is the larger of two: what the positions' own uncertainties and ISO
    3382-2's formula expect, and what their scatter shows from three positions on.
    """
    each = list(positions.values())
    bands = each[0].bands
    table = {
        name: np.array([[getattr(band, name) for band in one.each] for one in each], float)
        for name in ("t_s", "u_s", "t20_s", "t30_s", "edt_s", "range_db")
    }
    good = np.isfinite(table["t_s"])
    count = good.sum(axis=0)
    decays_of = np.array([one.count for one in each])
    worth = np.array([float(_worth(one)) for one in each])
    t_s = _mean(table["t_s"], good)
    evaluation = tuple(_most_used(each, n) for n in range(len(bands)))
    expected = np.array(
        [
            float(
                iso_uncertainty(
                    t_s[n], bands.width[n], count[n], np.mean(worth[good[:, n]]), evaluation[n]
                )
            )
            if count[n]
            else np.nan
            for n in range(len(bands))
        ]
    )
    own = np.sqrt(np.where(good, table["u_s"] ** 2, 0.0).sum(axis=0)) / np.maximum(count, 1)
    with np.errstate(invalid="ignore"):
        scatter = np.array(
            [
                np.std(table["t_s"][good[:, n], n], ddof=1) / np.sqrt(count[n])
                if count[n] >= 3
                else 0.0
                for n in range(len(bands))
            ]
        )
    u_s = np.where(count > 0, np.maximum(np.maximum(own, expected), scatter), np.nan)
    return Average(
        t_s=t_s,
        u_s=u_s,
        evaluation=evaluation,
        t20_s=_mean(table["t20_s"], np.isfinite(table["t20_s"])),
        t30_s=_mean(table["t30_s"], np.isfinite(table["t30_s"])),
        edt_s=_mean(table["edt_s"], np.isfinite(table["edt_s"])),
        range_db=np.array([_least(column) for column in table["range_db"].T]),
        positions=tuple(int(n) for n in count),
        decays=tuple(int(decays_of[good[:, n]].sum()) for n in range(len(bands))),
        flags=tuple(_flags(each, n) for n in range(len(bands))),
    )


IMPULSE_WORTH = 10
"""Decays of interrupted noise that one backward-integrated impulse response counts as
(ISO 3382-2:2008, annex A, from memory)."""


def _worth(one: Decays) -> int:
    """Decays behind a position, an impulse counted as ten."""
    from_noise = any(np.isfinite(band.whole_s) for band in one.each)
    return one.count if from_noise else IMPULSE_WORTH * one.count


def distance_doubts(
    sources: Mapping[str, Sequence[float]],
    microphones: Mapping[str, Sequence[float]],
    pairs: Sequence[tuple[str, str]],
    *,
    volume: float,
    reverberation_time: float,
    speed: float = 343.0,
) -> list[str]:
    """Positions of a survey that stand too close, in words.

    Parameters
    ----------
    sources, microphones
        Positions by name, as in the room file. [m]
    pairs
        Source and microphone position of each recording.
    volume, reverberation_time, speed
        For the least distance between them, 2 sqrt(V / (c T)) (ISO 3382-1). [m³], [s], [m/s]

    Notes
    -----
    Microphones are to stand 2 m from each other (half a wavelength, ISO 3382-2, from memory). Small
    rooms often cannot, so that only those closer than 1 m are said.
    """
    from itertools import combinations

    from planner.measure.noise import smallest_distance

    def apart(a: Sequence[float], b: Sequence[float]) -> float:
        return float(np.linalg.norm(np.subtract(a, b)))

    least = smallest_distance(volume, reverberation_time, speed)
    doubts = [
        f"Source {s} and microphone {m} stand {apart(sources[s], microphones[m]):.2f} m apart, "
        f"{least:.2f} m are wanted (2 sqrt(V/(c T)), ISO 3382-1)."
        for s, m in dict.fromkeys(pairs)
        if s in sources and m in microphones and apart(sources[s], microphones[m]) < least
    ]
    used = [m for m in dict.fromkeys(m for _, m in pairs) if m in microphones]
    doubts += [
        f"Microphones {a} and {b} stand {apart(microphones[a], microphones[b]):.2f} m apart, 2 m are "
        "wanted (ISO 3382-2, from memory): their decays are not independent in the bass."
        for a, b in combinations(used, 2)
        if apart(microphones[a], microphones[b]) < 1.0
    ]
    unknown = [
        f"{what} {name} is not among the room file's positions."
        for what, names, known in (
            ("Source", dict.fromkeys(s for s, _ in pairs), sources),
            ("Microphone", dict.fromkeys(m for _, m in pairs), microphones),
        )
        for name in names
        if known and name not in known
    ]
    return doubts + unknown


def _mean(values: Array, good: NDArray[np.bool_]) -> Array:
    count = good.sum(axis=0)
    total = np.where(good, values, 0.0).sum(axis=0)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean: Array = np.where(count > 0, total / count, np.nan)
    return mean


def _least(values: Array) -> float:
    known = values[np.isfinite(values)]
    return float(known.min()) if len(known) else float("nan")


def _most_used(each: Sequence[Decays], band: int) -> str:
    used = [one.each[band].used for one in each if one.each[band].used]
    return max(set(used), key=lambda name: (used.count(name), name)) if used else ""


def _flags(each: Sequence[Decays], band: int) -> tuple[str, ...]:
    """Doubts of all positions, each once; the reasons of refusals in words."""
    words: dict[str, int] = {}
    refused = 0
    reason = ""
    for one in each:
        result = one.each[band]
        if not result.used:
            refused += 1
            reason = reason or result.reason
        for flag in result.flags:
            if flag != "refused":
                words[flag] = words.get(flag, 0) + 1
    flags = list(words)
    if refused == len(each):
        flags.insert(0, f"refused: {reason}")
    elif refused:
        flags.append(f"refused at {refused} of {len(each)} positions")
    return tuple(flags)


def more_decays(average_: Average, wanted: float = 0.10) -> str:
    """How many more decays bring the worst band under a relative uncertainty, in words."""
    with np.errstate(invalid="ignore", divide="ignore"):
        relative = average_.u_s / average_.t_s
    if not np.isfinite(relative).any():
        return ""
    worst = int(np.nanargmax(relative))
    if relative[worst] <= wanted:
        return ""
    decays = average_.decays[worst]
    needed = int(np.ceil(decays * (relative[worst] / wanted) ** 2)) - decays
    return (
        f"The worst band is known to {relative[worst]:.0%}; about {needed} more decays, at new "
        f"positions where possible, bring it under {wanted:.0%}."
    )
