"""Recommended reverberation times and their tolerance bands, each with its source.

A recommendation that a source gives for a mean over several bands is applied to each of those bands:
stricter than its letter, and what a fitter can work with. Where a source gives no limit there is
none here: one-sided recommendations stay one-sided.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from difflib import get_close_matches

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.errors import RoomError
from planner.room.model import Room

Array = NDArray[np.float64]

SEEN = "seen"
FROM_MEMORY = "from memory"
JUDGEMENT = "a judgement of this project"
OWN = "own numbers"

_DIN = "DIN 18041"
_BB93 = "Building Bulletin 93"


@dataclass(frozen=True, slots=True)
class TargetLimits:
    """Limits of the reverberation time per octave; NaN where there is none."""

    name: str
    """The word for it in a room file, or ``own limits``."""
    description: str
    low: Array
    """Shape ``(band,)``. [s]"""
    aim: Array
    """What the source aims for within the limits, shape ``(band,)``. [s]"""
    high: Array
    """Shape ``(band,)``. [s]"""
    source: str
    edition: str
    condition: str
    """State of the room that the numbers are for."""
    basis: str
    """``seen``, ``from memory`` (the source was not at hand), a judgement, or ``own numbers``."""
    note: str = ""
    warnings: tuple[str, ...] = ()

    @property
    def citation(self) -> str:
        """Source, edition and how well they are known, in a line."""
        edition = f" ({self.edition})" if self.edition else ""
        return f"{self.source}{edition}; {self.basis}"

    @property
    def judged(self) -> NDArray[np.bool_]:
        """Bands with a limit, shape ``(band,)``."""
        return np.asarray(np.isfinite(self.low) | np.isfinite(self.high), bool)


@dataclass(frozen=True, slots=True)
class Use:
    """One published use of a room and its recommendation."""

    id: str
    description: str
    limits: Callable[[float], tuple[Array, Array, Array]]
    """low, aim and high of a volume in m³. [s]"""
    source: str
    edition: str
    basis: str
    condition: str = ""
    volumes: tuple[float, float] = (0.0, np.inf)
    """For which volumes the source means it. [m³]"""
    note: str = ""


def _bands(values: Mapping[int, float]) -> Array:
    return np.array([values.get(hz, np.nan) for hz in OCTAVES])


def _between(low_hz: int, high_hz: int, value: float) -> Array:
    return _bands({hz: value for hz in OCTAVES if low_hz <= hz <= high_hz})


def _listening(lowest: float, highest: float) -> Callable[[float], tuple[Array, Array, Array]]:
    """T_m = 0.25 (V/100)^(1/3) with the tolerance steps of ITU-R BS.1116 and EBU Tech 3276."""

    def limits(volume: float) -> tuple[Array, Array, Array]:
        mean = float(np.clip(0.25 * (volume / 100.0) ** (1.0 / 3.0), lowest, highest))
        hz = np.array(OCTAVES, float)
        # Upper tolerance: 0.3 s at 63 Hz, falling with the logarithm of frequency to 0.05 s at 200.
        rise = np.interp(np.log(hz), np.log([63.0, 200.0]), [0.30, 0.05])
        upper = mean + np.where(hz > 4000.0, 0.10, rise)
        lower = mean - np.where(hz > 4000.0, 0.10, 0.05)
        return np.maximum(lower, 0.05), np.full(len(OCTAVES), mean), upper

    return limits


_DIN_LOW = {125: 0.65, 250: 0.8, 500: 0.8, 1000: 0.8, 2000: 0.8, 4000: 0.65}
_DIN_HIGH = {125: 1.45, 250: 1.2, 500: 1.2, 1000: 1.2, 2000: 1.2, 4000: 1.2}
_DIN_MIDDLE = {250, 500, 1000, 2000}


def _din(
    slope: float, offset: float, *, middle_only: bool = False, largest: float = np.inf
) -> Callable[[float], tuple[Array, Array, Array]]:
    """T = slope · lg V + offset to two decimals, times the tolerance factors of figure 3."""

    def limits(volume: float) -> tuple[Array, Array, Array]:
        aim = min(round(slope * float(np.log10(volume)) + offset, 2), largest)
        low = {hz: f * aim for hz, f in _DIN_LOW.items() if hz in _DIN_MIDDLE or not middle_only}
        high = {hz: f * aim for hz, f in _DIN_HIGH.items() if hz in _DIN_MIDDLE or not middle_only}
        return _bands(low), _bands(dict.fromkeys(low, aim)), _bands(high)

    return limits


def _at_most(
    seconds: float, low_hz: int = 500, high_hz: int = 2000
) -> Callable[[float], tuple[Array, Array, Array]]:
    none = np.full(len(OCTAVES), np.nan)
    return lambda volume: (none, none, _between(low_hz, high_hz, seconds))


def _within(
    low: float, high: float, low_hz: int = 500, high_hz: int = 2000
) -> Callable[[float], tuple[Array, Array, Array]]:
    return lambda volume: (
        _between(low_hz, high_hz, low),
        _between(low_hz, high_hz, (low + high) / 2),
        _between(low_hz, high_hz, high),
    )


def _classroom(volume: float) -> tuple[Array, Array, Array]:
    none = np.full(len(OCTAVES), np.nan)
    return none, none, _between(500, 2000, 0.6 if volume <= 283.17 else 0.7)


def _voice(volume: float) -> tuple[Array, Array, Array]:
    low = _between(125, 4000, 0.20)
    high = _between(250, 4000, 0.30)
    high[OCTAVES.index(125)] = 0.45  # low bands within half as much again
    return low, _between(125, 4000, 0.25), high


_UNOCCUPIED = "unoccupied, furnished"
_BB93_CONDITION = "unoccupied, unfurnished or with fixed furniture only (from memory)"
_MEAN = "Given for the mean of 500, 1000 and 2000 Hz; applied to each of the three."
_DIN_NOTE = "63 Hz and 8 kHz are guidance only in the source and are not judged."

USES: tuple[Use, ...] = (
    Use("control-room-bs1116", "Control room, critical listening", _listening(0.0, 10.0),
        "ITU-R BS.1116-3, 8.2.3", "2015", FROM_MEMORY,
        note="The formula agrees with EBU Tech 3276; the corners of the tolerance steps are from memory."),
    Use("listening-room-ebu3276", "Listening room, sound control room", _listening(0.2, 0.4),
        "EBU Tech 3276, 2.3", "2nd edition, 1998", "formula and limits seen, tolerances from memory"),
    Use("listening-room-iec60268", "Living room for listening tests",
        _within(0.3, 0.6, 250, 4000), "IEC 60268-13", "", FROM_MEMORY),
    Use("control-room-bb93", "Control room for recording in a school", _at_most(0.5), f"{_BB93}, table 6", "2003 wording",
        SEEN, _BB93_CONDITION, note=_MEAN),
    Use("recording-room-bb93", "Recording room in a school", _within(0.6, 1.2), f"{_BB93}, table 6", "2003 wording",
        SEEN, _BB93_CONDITION, note=_MEAN),
    Use("voice-room", "Voice recording, podcast or home voice room", _voice, "no formal standard", "", JUDGEMENT,
        volumes=(5.0, 60.0), note="Derived from the lower clamp of EBU Tech 3276."),
    Use("rehearsal-small-bb93", "Small music practice or group room", _at_most(0.8), f"{_BB93}, table 6", "2003 wording",
        SEEN, _BB93_CONDITION, note=_MEAN),
    Use("rehearsal-ensemble-bb93", "Ensemble rehearsal room", _within(0.6, 1.2), f"{_BB93}, table 6", "2003 wording",
        SEEN, _BB93_CONDITION, note=_MEAN),
    Use("recital-bb93", "Performance or recital room", _within(1.0, 1.5), f"{_BB93}, table 6", "2003 wording",
        SEEN, _BB93_CONDITION, note=_MEAN),
    Use("music-classroom-bb93", "Music classroom", _at_most(1.0), f"{_BB93}, table 6", "2003 wording",
        SEEN, _BB93_CONDITION, note=_MEAN),
    Use("classroom-s1260", "Classroom (core learning space)", _classroom, "ANSI/ASA S12.60, part 1, table 1", "2010",
        "values seen, list of bands from memory", _UNOCCUPIED, (0.0, 566.34),
        "0.6 s up to 283 m³ (10 000 ft³), 0.7 s up to 566 m³; background noise is limited too."),
    Use("classroom-primary-bb93", "Primary classroom", _at_most(0.6), f"{_BB93}, table 6", "2015", FROM_MEMORY,
        _BB93_CONDITION, note=_MEAN),
    Use("classroom-secondary-bb93", "Secondary classroom, seminar room", _at_most(0.8), f"{_BB93}, table 6", "2015",
        FROM_MEMORY, _BB93_CONDITION, note=_MEAN),
    Use("classroom-inclusive-bb93", "Room for listeners with impaired hearing", _at_most(0.4, 125, 4000),
        f"{_BB93}, table 6", "2015", FROM_MEMORY, _BB93_CONDITION,
        note="Given for the mean of 125 Hz to 4 kHz; applied to each band."),
    Use("music-din18041-a1", "Music (group A1)", _din(0.45, 0.07), _DIN, "2016-03",
        "formula seen, tolerances from memory", "occupied to 80 % (from memory)", (30.0, 1000.0), _DIN_NOTE),
    Use("speech-din18041-a2", "Speech to an audience (group A2)", _din(0.37, -0.14), _DIN, "2016-03",
        "formula seen, tolerances from memory", "occupied to 80 % (from memory)", (50.0, 5000.0), _DIN_NOTE),
    Use("teaching-din18041-a3", "Teaching and communication (group A3)", _din(0.32, -0.17), _DIN, "2016-03",
        "formula seen, tolerances from memory", "occupied to 80 % (from memory)", (30.0, 5000.0), _DIN_NOTE),
    Use("inclusive-din18041-a4", "Inclusive teaching and communication (group A4)", _din(0.26, -0.14), _DIN,
        "2016-03", "formula seen, tolerances from memory", "occupied to 80 % (from memory)", (30.0, 500.0), _DIN_NOTE),
    Use("sport-din18041-a5", "Sport (group A5)", _din(0.75, -1.00, middle_only=True, largest=2.0), _DIN, "2016-03",
        "formula seen, tolerances from memory", "", (200.0, np.inf), "2.0 s from 10 000 m³."),
    Use("meeting-room", "Small meeting room", _within(0.3, 0.5, 250, 4000), "no formal standard", "",
        JUDGEMENT, _UNOCCUPIED, (10.0, 150.0), "Two trade guides name 0.3 to 0.5 s."),
)  # fmt: skip
"""Every published use the planner knows."""

_BY_ID = {use.id: use for use in USES}


def target_limits(use: str, volume: float) -> TargetLimits:
    """Limits of a published use for a room of that volume.

    Parameters
    ----------
    use
        One of the ids in `USES`.
    volume
        [m³]

    Raises
    ------
    RoomError
        There is no such use; the nearest are named.
    """
    if use not in _BY_ID:
        near = get_close_matches(use, _BY_ID, n=3, cutoff=0.3)
        hint = f"Did you mean {' or '.join(near)}? " if near else ""
        raise RoomError(
            f"no target is known for the use {use!r}",
            where="[target] use",
            cure=f"{hint}Known: {', '.join(_BY_ID)}; or give low and high of your own.",
        )
    known = _BY_ID[use]
    low, aim, high = known.limits(volume)
    smallest, largest = known.volumes
    doubts = []
    if not smallest <= volume <= largest:
        doubts.append(
            f"The target {use} is meant for {smallest:g} to {largest:g} m³; this room has "
            f"{volume:.0f} m³."
        )
    if known.basis != SEEN:
        doubts.append(f"The target {use} is not fully checked against its source ({known.basis}).")
    return TargetLimits(
        name=use,
        description=known.description,
        low=low,
        aim=aim,
        high=high,
        source=known.source,
        edition=known.edition,
        condition=known.condition,
        basis=known.basis,
        note=known.note,
        warnings=tuple(doubts),
    )


def own_limits(low: Mapping[int, float], high: Mapping[int, float]) -> TargetLimits:
    """Limits of one's own, per octave in seconds; a band that is left out is not judged."""
    lower, upper = _bands(low), _bands(high)
    return TargetLimits(
        name="own limits",
        description="Limits given in the room file",
        low=lower,
        aim=(lower + upper) / 2,
        high=upper,
        source="room file",
        edition="",
        condition="as described in the room file",
        basis=OWN,
    )


def target_of(room: Room, volume: float) -> TargetLimits | None:
    """The target that a room file names, or None where it names none.

    Limits of one's own beside a published use replace that use's in their bands.

    Raises
    ------
    RoomError
        The use is not known, or the limits contradict each other.
    """
    wanted = room.target
    if wanted is None:
        return None
    own = own_limits(wanted.low, wanted.high)
    if wanted.use is None:
        return own
    published = target_limits(wanted.use, volume)
    if not (wanted.low or wanted.high):
        return published
    low = np.where(np.isfinite(own.low), own.low, published.low)
    high = np.where(np.isfinite(own.high), own.high, published.high)
    for hz, least, most in zip(OCTAVES, low, high, strict=True):
        if least > most:
            raise RoomError(
                f"at {hz} Hz the limits are {least:.2f} s to {most:.2f} s",
                where="[target]",
                cure="Give low and high of that band together.",
            )
    return TargetLimits(
        name=f"{wanted.use}, changed",
        description=f"{published.description}, with limits of the room file's own",
        low=low,
        aim=np.where(np.isfinite(own.aim), own.aim, published.aim),
        high=high,
        source=f"{published.source} and the room file",
        edition=published.edition,
        condition=published.condition,
        basis=published.basis,
        note=published.note,
        warnings=published.warnings,
    )
