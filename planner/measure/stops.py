"""Where the noise stops: bursts of steady noise and their switch-offs, from levels over time.

Levels are those of the first difference of the signal. It lifts the treble, where noise fluctuates
least from frame to frame, and takes hum and rumble out, so that a kilohertz of hiss outweighs a
roaring ventilator.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

FRAME_S = 0.010
"""Frame of the level over a whole file. [s]"""

FINE_S = 0.0005
"""Frame around a switch-off. [s]"""

FALL_DB = 10.0
"""The level must fall by this much for noise to have stopped. [dB]"""

STEADY_DB = 4.0
"""Steady noise stays this near its median in frames of 50 ms. [dB]"""

EDGE_DB = 1.0
"""A burst roughly ends with the last such frame this near its median. [dB]"""

SHORTEST_NOISE_S = 1.0
"""Least steady noise before a switch-off (Nordtest NT ACOU 053 and 059 ask for a second). [s]"""

SHORTEST_SILENCE_S = 0.4
"""Least recording after it. [s]"""

REACH_S, WINDOW_S = 0.15, 0.30
"""A switch-off is sought this far around its rough place, by the decay this long behind it. [s]"""

TIMES_S = np.geomspace(0.06, 6.0, 24)
"""Reverberation times tried for that decay. [s]"""

DROPS = (1.0, 0.8, 0.6, 0.4, 0.15)
"""Shares of the level that stay when the direct sound ends. [-]"""

REGULAR_S = 0.02
"""Switch-offs this near to a steady beat are taken to follow it. [s]"""

DROP_COST = 0.8
"""A drop must explain the frames this much better than none; a frame counts some eight degrees of
freedom, so this is a factor of several hundred in likelihood. [-]"""


@dataclass(frozen=True, slots=True)
class Burst:
    """Steady noise and the end of it, in frames of `FRAME_S`."""

    start: int
    stop: int
    """First frame after it."""
    next_start: int
    """Where the next burst begins, or the recording ends."""
    level_db: float
    """Median level of the steady noise. [dB]"""
    fall_db: float
    """How far the level falls after it. [dB]"""


def smoothed(power: Array, frames: int) -> Array:
    """Running mean over `frames` frames, same length."""
    if len(power) < frames:
        return np.full(len(power), power.mean() if len(power) else 0.0)
    total = np.cumsum(np.concatenate([[0.0], power]))
    inner = (total[frames:] - total[:-frames]) / frames
    left = frames // 2
    return np.pad(inner, (left, len(power) - len(inner) - left), mode="edge")


def level(power: Array) -> Array:
    """10 lg, with digital silence at −200 dB."""
    decibels: Array = 10.0 * np.log10(np.maximum(power, 1e-20))
    return decibels


def find_bursts(power: Array) -> list[Burst]:
    """Stretches of steady noise that end with a fall of level.

    Parameters
    ----------
    power
        Mean square of the differenced signal per frame of `FRAME_S`, shape ``(frame,)``.

    Returns
    -------
    bursts
        In order of time; also those too short to use, which the caller refuses with the reason.
    """
    if len(power) < 10:
        return []
    slow = level(smoothed(power, 5))
    loud, quiet = _sustained(slow), float(np.quantile(slow, 0.02))
    if loud - quiet < FALL_DB:
        return []
    # Half-way in level between noise and floor, but never so low that a decay counts as noise.
    threshold = max(loud - 12.0, (loud + quiet) / 2.0)
    runs = _runs(slow > threshold)
    runs = _joined(runs, gap=3)
    found = []
    for number, (start, stop) in enumerate(runs):
        following = runs[number + 1][0] if number + 1 < len(runs) else len(power)
        stretch = slow[start:stop]
        middle = float(np.median(stretch))
        after = slow[stop:following]
        fall = middle - float(np.median(after[-max(len(after) // 4, 1) :])) if len(after) else 0.0
        inside = np.flatnonzero(stretch > middle - EDGE_DB)
        end = start + int(inside[-1]) + 1 if len(inside) else stop
        found.append(Burst(start, end, following, middle, fall))
    return found


def _sustained(slow: Array) -> float:
    """Highest level that is held for 0.8 s anywhere: noise, however little of the file it fills."""
    tenth = round(0.1 / FRAME_S)
    whole = len(slow) // tenth * tenth
    least = slow[:whole].reshape(-1, tenth).min(axis=1)
    if len(least) < 8:
        return float(np.quantile(slow, 0.95))
    return float(np.lib.stride_tricks.sliding_window_view(least, 8).min(axis=1).max())


def _runs(flags: NDArray[np.bool_]) -> list[tuple[int, int]]:
    edges = np.diff(np.concatenate([[0], flags.astype(np.int8), [0]]))
    starts, stops = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)
    return [(int(a), int(b)) for a, b in zip(starts, stops, strict=True)]


def _joined(runs: list[tuple[int, int]], gap: int) -> list[tuple[int, int]]:
    """Runs with gaps of a few frames closed."""
    joined: list[tuple[int, int]] = []
    for start, stop in runs:
        if joined and start - joined[-1][1] <= gap:
            joined[-1] = (joined[-1][0], stop)
        else:
            joined.append((start, stop))
    return joined


def steadiness_db(power: Array) -> float:
    """Spread of the level of steady noise in frames of 50 ms, between its 5th and 95th percentile."""
    slow = level(smoothed(power, 5))[2:-2]
    return float(np.subtract(*np.quantile(slow, [0.95, 0.05]))) if len(slow) > 4 else 0.0


def switch_off(power: Array, expected: int, floor: float) -> int:
    """Frame at which steady noise turns into an exponential decay.

    Parameters
    ----------
    power
        Mean square of the differenced signal in frames of `FINE_S`, from steady noise to decay.
    expected
        Frame near which the level begins to fall.
    floor
        Mean square that the decay ends in.

    Returns
    -------
    frame
        First frame after the switch-off: the change point of greatest likelihood between constant
        noise and an exponential decay with floor, the frames' energies being gamma-distributed.
    """
    reach, window = round(REACH_S / FINE_S), round(WINDOW_S / FINE_S)
    low, high = max(expected - reach, 1), min(expected + reach, len(power) - 20)
    end = min(high + window, len(power))
    if high <= low:
        return expected
    steady = float(np.mean(power[: max(low - 5, 5)]))
    if steady <= 0.0:
        return expected
    floor = min(max(floor, 1e-6 * steady), 0.5 * steady)
    trial = _Trials(power[low:end], high - low, steady, floor)
    # The grid of times is coarse: each drop is judged by its own best time, refined.
    return low + min(_refined(trial, drop) for drop in DROPS)[3]


def regular(stops_s: Sequence[float]) -> tuple[float, ...]:
    """Switch-offs of a signal with bursts of one length, each sharpened by all the others. [s].

    From three on, when they lie within `REGULAR_S` of a steady beat (a test signal's, whatever the
    two clocks make of it), that beat replaces them; any others stay as they were found.
    """
    found = np.asarray(stops_s, float)
    if len(found) < 3:
        return tuple(float(stop) for stop in found)
    beat = float(np.median(np.diff(found)))
    count = np.round((found - found[0]) / beat) if beat > 0 else np.zeros(len(found))
    if len(np.unique(count)) < len(found):
        return tuple(float(stop) for stop in found)
    fitted = np.polyval(np.polyfit(count, found, 1), count)
    if np.abs(found - fitted).max() > REGULAR_S:
        return tuple(float(stop) for stop in found)
    return tuple(float(stop) for stop in fitted)


def _refined(trial: _Trials, drop: float) -> tuple[float, float, float, int]:
    """The best trial with about this drop."""
    coarse = min(trial(time_s, drop) for time_s in TIMES_S)
    step = float(TIMES_S[1] / TIMES_S[0])
    shares = (0.9, 1.0, 1.1) if drop < 1.0 else (1.0,)
    return min(
        trial(coarse[1] * factor, min(drop * share, 0.999))
        if drop < 1.0
        else trial(coarse[1] * factor, 1.0)
        for factor in np.geomspace(1.0 / step, step, 9)
        for share in shares
    )


class _Trials:
    """Costs of every candidate for one decay time and one drop of level.

    All candidates are judged by the same frames: steady before them, decaying from them on.
    """

    def __init__(self, piece: Array, candidates: int, steady: float, floor: float) -> None:
        count = len(piece)
        self.steady, self.floor = steady, floor
        self.behind = np.arange(count, count - candidates, -1) - 1
        cost = np.log(steady) + piece / steady
        self.before = np.concatenate([[0.0], np.cumsum(cost)])[:candidates]
        self.padded = np.concatenate([piece, np.zeros(candidates - 1)])
        self.age = (np.arange(count) + 0.5) * FINE_S

    def __call__(self, time_s: float, drop: float) -> tuple[float, float, float, int]:
        """Least cost, the parameters, and the candidate that has it."""
        start = max(drop * self.steady - self.floor, 1e-3 * self.steady)
        mean = start * 10.0 ** (-6.0 * self.age / time_s) + self.floor
        cost = self.before + np.cumsum(np.log(mean))[self.behind]
        cost = cost + np.correlate(self.padded, 1.0 / mean, mode="valid")
        best = int(np.argmin(cost))
        penalty = DROP_COST if drop < 1.0 else 0.0
        return float(cost[best]) + penalty, float(time_s), float(drop), best
