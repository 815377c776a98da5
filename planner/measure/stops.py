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

REACH_S = 0.15
"""A switch-off is sought this far around its rough place. [s]"""

NEAR_S = 0.01
"""And then in fine frames this far around the place found in coarse ones. [s]"""

COARSE = 4
"""Fine frames in a coarse one: time and drop of the decay are found in a sixteenth of the work."""

WINDOWS_S = (0.15, 0.8)
"""It is judged by the decay behind it, until that has fallen by 20 dB, within these limits. [s]"""

TIMES_S = np.geomspace(0.06, 6.0, 24)
"""Reverberation times tried for that decay. [s]"""

DROPS = (1.0, 0.85, 0.7, 0.55, 0.4, 0.25, 0.1)
"""Shares of the level that stay when the direct sound ends. [-]"""

DROP_STEPS = np.array([-0.1, -0.05, 0.0, 0.05, 0.1])
"""How they are refined. [-]"""

REGULAR_S = 0.02
"""Switch-offs this near to a steady beat are taken to follow it. [s]"""

DROP_NATS = 3.0
"""A drop must explain the frames this much better than none, as log-likelihood: about half the
logarithm of their number (G. Schwarz, Ann. Stat. 6 (1978) 461). [-]"""


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


@dataclass(frozen=True, slots=True)
class Approach:
    """What is recorded around one rough switch-off."""

    power: Array
    """Mean square of the differenced signal in frames of `FINE_S`, from steady noise to decay."""
    expected: int
    """Frame near which the level begins to fall."""
    floor: float
    """Mean square that the decay ends in."""


def switch_offs(approaches: Sequence[Approach]) -> list[int]:
    """Frames at which the bursts of one recording turn into exponential decays.

    Parameters
    ----------
    approaches
        One per burst, all of one microphone in one room.

    Returns
    -------
    frames
        First frame after each switch-off: the change point of greatest likelihood between constant
        noise and an exponential decay with floor, the frames' energies being gamma-distributed.
        Time and drop of the decay are the room's and hence shared: each burst alone cannot tell a
        drop of 1 dB, when the direct sound ends, from a switch-off a little earlier.
    """
    window = float(np.clip(np.median([_fall_s(each) for each in approaches]), *WINDOWS_S))
    coarse = [_trials(each, COARSE, REACH_S, window) for each in approaches]
    drop_cost = DROP_NATS / max(float(np.median([trial.shape for trial in coarse])), 1.0)

    def cost(time_s: float, drop: float) -> float:
        least = sum(trial(time_s, drop)[0] for trial in coarse)
        return least + (drop_cost if drop < 1.0 else 0.0)

    def refined(drop: float, times: Array) -> tuple[float, float, float]:
        # The grid of times is coarse: each drop is judged by its own best time.
        about = min((cost(time_s, drop), time_s) for time_s in times)[1]
        finer = about * np.geomspace(times[0] / times[1], times[1] / times[0], 13)
        return min((cost(time_s, drop), float(time_s), drop) for time_s in finer)

    best = min(refined(drop, TIMES_S) for drop in DROPS)
    if best[2] < 1.0:
        near = best[1] * np.geomspace(0.9, 1.1, 5)
        best = min(refined(float(drop), near) for drop in np.clip(best[2] + DROP_STEPS, 0.03, 0.98))
    _, time_s, drop = best
    found = []
    for each, trial in zip(approaches, coarse, strict=True):
        rough = trial(time_s, drop)[1]
        fine = _trials(Approach(each.power, rough, each.floor), 1, NEAR_S, window, trial.steady)
        found.append(fine(time_s, drop)[1])
    return found


def _fall_s(approach: Approach) -> float:
    """How long the level takes to fall by 20 dB, or nearly to the floor. [s]."""
    after = smoothed(approach.power[approach.expected :], 40)
    steady = float(np.mean(approach.power[: max(approach.expected - 100, 1)]))
    low = np.flatnonzero(after < max(0.01 * steady, 2.0 * approach.floor))
    return float(low[0] if len(low) else len(after)) * FINE_S


def _trials(
    approach: Approach, group: int, reach_s: float, window_s: float, steady: float | None = None
) -> _Trials:
    """Candidates around the expected frame, in frames of `group` fine ones."""
    step = FINE_S * group
    whole = len(approach.power) // group * group
    power = approach.power[:whole].reshape(-1, group).mean(axis=1)
    expected, reach = approach.expected // group, round(reach_s / step)
    high = min(expected + reach, len(power) - 2)
    low = min(max(expected - reach, 1), high - 1)
    if steady is None:
        steady = float(np.mean(power[: max(low, 1)]))
    end = min(high + round(window_s / step), len(power))
    return _Trials(power, (low, high, end), group, max(steady, 1e-30), approach.floor)


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


class _Trials:
    """Costs of every candidate for one decay time and one drop of level.

    All candidates are judged by the same frames: steady before them, decaying from them on. The cost
    is the negative log-likelihood over the shape of the frames' gamma distribution.
    """

    def __init__(
        self, power: Array, place: tuple[int, int, int], group: int, steady: float, floor: float
    ) -> None:
        low, high, end = place
        piece, candidates = power[low:end], high - low
        count = len(piece)
        self.low, self.group, self.steady = low, group, steady
        self.floor = min(max(floor, 1e-6 * steady), 0.5 * steady)
        before = power[:low]
        spread = float(np.var(before)) if low > 20 else 0.0
        self.shape = float(np.mean(before)) ** 2 / spread if spread > 0 else 8.0 * group
        self.behind = np.arange(count, count - candidates, -1) - 1
        cost = np.log(steady) + piece / steady
        self.before = np.concatenate([[0.0], np.cumsum(cost)])[:candidates]
        self.padded = np.concatenate([piece, np.zeros(candidates - 1)])
        self.age = (np.arange(count) + 0.5) * FINE_S * group

    def __call__(self, time_s: float, drop: float) -> tuple[float, int]:
        """Least cost, and the fine frame of the candidate that has it."""
        start = max(drop * self.steady - self.floor, 1e-3 * self.steady)
        mean = start * 10.0 ** (-6.0 * self.age / time_s) + self.floor
        cost = self.before + np.cumsum(np.log(mean))[self.behind]
        cost = cost + np.correlate(self.padded, 1.0 / mean, mode="valid")
        best = int(np.argmin(cost))
        return float(cost[best]), (self.low + best) * self.group
