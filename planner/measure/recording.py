"""One recording: its level over time, its bursts, what was found in it, and its decays."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import RecordingError
from planner.measure import stops, tamper
from planner.measure.filterbank import (
    OCTAVE_BANDS,
    BandEnergies,
    Bands,
    section_energies,
)
from planner.measure.sound_file import SoundFile
from planner.measure.stops import FRAME_S, Burst
from planner.measure.tamper import CLIPPED_RUN, Finding

Array = NDArray[np.float64]

BEFORE_S = 1.5
"""Steady noise kept before a switch-off, where there is as much. [s]"""

LEAST_TAIL_S = 5.0
"""At least this much after a switch-off is evaluated, where it is recorded. [s]"""

NOISE_S, DECAY_S = 2.0, 1.1
"""A switch-off is found from this much steady noise and decay around it, where there is as much. [s]"""

SPARE_S = 0.06
"""The decay ends this long before the next burst begins. [s]"""

HOT = 1.0
"""Full scale. [-]"""

LONG_S, SAMPLED = 120.0, 96
"""Of recordings longer than this [s] the level is taken from the first so many samples of each frame:
enough for a level that is smoothed over 50 ms, and a fifth of the work."""


@dataclass(frozen=True, slots=True)
class Scan:
    """What one pass over a file gives, per channel."""

    power: Array
    """Mean square of the first difference per `FRAME_S`, shape ``(channel, frame)``."""
    peak: Array
    """Largest magnitude, shape ``(channel,)``."""
    clipped: NDArray[np.intp]
    """Runs of equal samples at that peak, shape ``(channel,)``."""
    clipped_at: Array
    """Where the first of them stands, shape ``(channel,)``. [s]"""
    correlation: Array
    """Of each channel with the first, shape ``(channel,)``. [-]"""


@dataclass(frozen=True, slots=True)
class Recording:
    """The usable decays of one file."""

    file: str
    channel: int
    """The one that was used, counted from 1."""
    bursts: tuple[BandEnergies, ...]
    """Frames of 1 ms, counted from each switch-off."""
    stops_s: tuple[float, ...]
    """[s]"""
    findings: tuple[Finding, ...]
    notes: tuple[str, ...]
    """What was dropped or repaired, in words."""

    @property
    def warnings(self) -> tuple[str, ...]:
        """Notes and findings together; what a note tells already, and a cure, are said once."""
        told, rest, cured = list(self.notes), [], set[str]()
        for finding in self.findings:
            at = next((n for n, note in enumerate(told) if finding.what in note), None)
            said = finding.cure in cured
            cured.add(finding.cure)
            if at is None:
                rest.append(str(finding).removesuffix(f" {finding.cure}" if said else ""))
            elif not said:
                told[at] = f"{told[at]} {finding.cure}"
        return (*told, *rest)


def scan(file: SoundFile) -> Scan:
    """Level, peaks and clipping of every channel in one pass, block by block."""
    step = round(FRAME_S * file.rate)
    parts: list[Array] = []
    channels = file.channels
    peak, sums = np.zeros(channels), np.zeros((channels, 2))
    clipped, clipped_at = np.zeros(channels, np.intp), np.full(channels, np.nan)
    position = 0
    used = step if file.duration_s < LONG_S else min(step, SAMPLED)
    for block in file.blocks(step * max(2**17 // step, 1)):
        frames = block[: len(block) // step * step].reshape(-1, step, channels)[:, :used]
        difference = frames[:, 1:] - frames[:, :-1]
        parts.append(np.einsum("fsc,fsc->cf", difference, difference) / (used - 1))
        highest = np.maximum(block.max(axis=0), -block.min(axis=0))
        for channel in range(channels):
            if highest[channel] > peak[channel] * 1.0001:
                clipped[channel], clipped_at[channel] = 0, np.nan
            peak[channel] = max(peak[channel], highest[channel])
            if highest[channel] >= 0.9999 * peak[channel] > 0.01:
                magnitude = np.abs(block[:, channel])
                runs, first = _flat_runs(magnitude, 0.9999 * float(peak[channel]))
                if runs and np.isnan(clipped_at[channel]):
                    clipped_at[channel] = (position + first) / file.rate
                clipped[channel] += runs
        if channels > 1:
            sums[:, 0] += np.einsum("ij,i->j", block, block[:, 0], dtype=float)
            sums[:, 1] += np.einsum("ij,ij->j", block, block, dtype=float)
        position += len(block)
    power = np.concatenate(parts, axis=1).astype(float) if parts else np.zeros((channels, 0))
    with np.errstate(divide="ignore", invalid="ignore"):
        correlation = np.nan_to_num(sums[:, 0] / np.sqrt(sums[:, 1] * sums[0, 1]))
    return Scan(power, peak, clipped, clipped_at, correlation)


def _flat_runs(magnitude: NDArray[np.float32], threshold: float) -> tuple[int, int]:
    """How often the signal stays at its peak, and where first."""
    at_peak = magnitude >= threshold
    if np.count_nonzero(at_peak) < CLIPPED_RUN:
        return 0, 0
    edges = np.diff(np.concatenate([[0], at_peak.astype(np.int8), [0]]))
    starts, ends = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)
    long = (ends - starts) >= CLIPPED_RUN
    return int(np.count_nonzero(long)), int(starts[long][0]) if long.any() else 0


def choose_channel(file: SoundFile, found: Scan) -> tuple[int, list[str]]:
    """The louder clean channel, and words about the choice; channels are never mixed.

    Raises
    ------
    RecordingError
        Every channel is silent.
    """
    loudness = found.power.mean(axis=1) if found.power.size else np.zeros(file.channels)
    alive = (found.peak > 1e-6) & (loudness > 0)
    if not alive.any():
        raise RecordingError(
            "holds only silence", file=file.path, cure="Check cable, input and recording level."
        )
    if file.channels == 1:
        return 0, []
    clean = alive & (found.clipped == 0)
    pool = clean if clean.any() else alive
    chosen = int(np.argmax(np.where(pool, loudness, -1.0)))
    notes = [f"Channel {chosen + 1} of {file.channels} is used; channels are not mixed."]
    dead = [str(n + 1) for n in range(file.channels) if not alive[n]]
    if dead:
        notes.append(f"Channel {', '.join(dead)} is silent: check its cable.")
    elif np.all(found.correlation > 0.99999):
        notes.append("All channels hold the same signal: they are one position, not several.")
    elif file.channels == 2 and found.correlation[1] < -0.95:
        notes.append("The channels are inverted against each other: check the wiring.")
    return chosen, notes


def read_recording(
    path: str | Path, *, bands: Bands = OCTAVE_BANDS, reverse: bool = True
) -> Recording:
    """Find the switch-offs of a recording of interrupted noise and filter the decays.

    Parameters
    ----------
    path
        WAV, FLAC, AIFF or what else libsndfile reads, 16 kHz or more.
    bands
        Wanted bands; those beyond the file's rate are left out.
    reverse
        Time-reversed filters.

    Returns
    -------
    recording
        With no burst where none could be used: the notes then say why.

    Raises
    ------
    RecordingError
        The file cannot be read, or is silent.
    """
    with SoundFile(path) as file:
        found = scan(file)
        channel, notes = choose_channel(file, found)
        notes = [*file.notes, *notes]
        offered = bands.offered(file.rate)
        missing = [f"{hz:g}" for hz in bands.nominal if hz not in offered.nominal]
        if missing:
            notes.append(f"{', '.join(missing)} Hz: not recorded at a rate of {file.rate} Hz.")
        power = found.power[channel]
        findings = _overload(found, channel, file.duration_s)
        kept: list[BandEnergies] = []

        def read(first: int, last: int) -> NDArray[np.float32]:
            return np.ascontiguousarray(file.read(first, last)[:, channel])

        bursts = stops.find_bursts(power)
        if not bursts:
            notes.append(_nothing_found(power))
        usable: list[Burst] = []
        for number, burst in enumerate(bursts, 1):
            refusal, grave = _check(power, burst, number)
            findings.extend(finding for finding in grave if finding not in findings)
            if refusal:
                notes.append(refusal)
            else:
                usable.append(burst)
        stops_s = stops.regular(_fine_stops(read, file.rate, usable, power))
        for burst, stop_s in zip(usable, stops_s, strict=True):
            stop = round(stop_s * file.rate)
            end = _end_of_decay(power, burst, stop, file.rate, file.frames)
            start = max(
                round(burst.start * FRAME_S * file.rate), stop - round(BEFORE_S * file.rate)
            )
            kept.append(
                section_energies(
                    read,
                    file.rate,
                    start,
                    end,
                    offered,
                    frame_s=0.001,
                    origin=stop,
                    reverse=reverse,
                )
            )
        findings.extend(_spectral(kept, stops_s, read, file.rate, bursts, power))
        return Recording(
            file=file.path.name,
            channel=channel + 1,
            bursts=tuple(kept),
            stops_s=stops_s,
            findings=tuple(findings),
            notes=tuple(notes),
        )


def _end_of_decay(power: Array, burst: Burst, stop: int, rate: int, frames: int) -> int:
    """Sample up to which the decay and enough of the floor after it reach."""
    tail = stops.level(stops.smoothed(power[burst.stop : burst.next_start], 5))
    floor = float(np.median(tail[-max(len(tail) // 4, 1) :]))
    above = np.flatnonzero(tail > floor + 3.0)
    # The bass may ring twice as long as the treble that this level is of.
    fallen = (
        float(above[above < len(tail) // 2][-1] * FRAME_S)
        if np.any(above < len(tail) // 2)
        else 0.0
    )
    needed = stop + round(max(LEAST_TAIL_S, 2.0 * fallen + 1.5) * rate)
    last = frames
    if burst.next_start < len(power):
        last = min(round((burst.next_start * FRAME_S - SPARE_S) * rate), frames)
    return min(needed, last)


def _overload(found: Scan, channel: int, duration_s: float) -> list[Finding]:
    if found.clipped[channel] < 2:
        return []
    peak = float(found.peak[channel])
    where = float(found.clipped_at[channel])
    kind = (
        "clipped"
        if peak >= 0.98 * HOT
        else f"limited at {20 * np.log10(peak):.1f} dB of full scale"
    )
    return [
        Finding(
            f"{found.clipped[channel]} peaks are {kind}",
            "Turn the recording level down by 6 to 10 dB and switch off the limiter.",
            where,
            duration_s,
            fatal=True,
        )
    ]


def _check(power: Array, burst: Burst, number: int) -> tuple[str, list[Finding]]:
    """Why a burst cannot be used (empty: it can), and what was found in it."""
    length, after = (burst.stop - burst.start) * FRAME_S, (burst.next_start - burst.stop) * FRAME_S
    place = f"Burst {number} (stops at {burst.stop * FRAME_S:.2f} s) is not used:"
    if length < stops.SHORTEST_NOISE_S:
        return (
            f"{place} {length:.1f} s of steady noise, {stops.SHORTEST_NOISE_S:g} s are needed. "
            "Let the noise run longer.",
            [],
        )
    if after < stops.SHORTEST_SILENCE_S:
        return (
            f"{place} only {after:.1f} s are recorded after it. Keep recording until the room is "
            "quiet.",
            [],
        )
    if burst.fall_db < stops.FALL_DB:
        return (
            f"{place} the level falls by only {burst.fall_db:.0f} dB. Raise the playback level or "
            "quieten the room.",
            [],
        )
    inner = power[burst.start + 20 : burst.stop - 5]
    spread = stops.steadiness_db(inner)
    tail, at = power[burst.stop : burst.next_start - 3], burst.stop
    grave = [
        finding
        for finding in (
            tamper.gated(tail, at),
            tamper.drifting(inner, burst.start + 20),
            tamper.fading(power[burst.stop - 2 : burst.next_start], at - 2),
            tamper.floor_rising(tail, at),
        )
        if finding is not None
    ]
    if grave:
        return f"{place} {grave[0].what}.", grave
    if spread > 2.0 * stops.STEADY_DB:
        return (
            f"{place} the noise is not steady (it varies by {spread:.0f} dB). Play steady pink "
            "noise, and keep speech and doors out.",
            [],
        )
    return "", []


def _fine_stops(
    read: Callable[[int, int], NDArray[np.float32]], rate: int, bursts: list[Burst], power: Array
) -> list[float]:
    """Times of the switch-offs. [s]."""
    if not bursts:
        return []
    step = round(stops.FINE_S * rate)
    firsts, approaches = [], []
    for burst in bursts:
        first = round(max(burst.stop * FRAME_S - NOISE_S, burst.start * FRAME_S + 0.2) * rate)
        last = round(min(burst.stop * FRAME_S + DECAY_S, burst.next_start * FRAME_S) * rate)
        squared = np.diff(read(first, last).astype(float)) ** 2
        whole = len(squared) // step * step
        tail = power[burst.stop : burst.next_start]
        firsts.append(first)
        approaches.append(
            stops.Approach(
                power=squared[:whole].reshape(-1, step).mean(axis=1),
                expected=round((burst.stop * FRAME_S * rate - first) / step),
                floor=float(np.median(tail[-max(len(tail) // 4, 1) :])),
            )
        )
    found = stops.switch_offs(approaches)
    return [(first + frame * step) / rate for first, frame in zip(firsts, found, strict=True)]


def _spectral(
    kept: list[BandEnergies],
    stops_s: Sequence[float],
    read: Callable[[int, int], NDArray[np.float32]],
    rate: int,
    bursts: list[Burst],
    power: Array,
) -> list[Finding]:
    """What the spectrum of the steady noise and of the floor shows."""
    if not kept:
        return []
    first = kept[0]
    before = first.times < 0
    steady = BandEnergies(
        first.energy[before],
        first.frame_s,
        first.begin_s + stops_s[0],
        first.bands,
        first.reverse,
    )
    findings = [tamper.thin_bands(steady)]
    last = max(bursts, key=lambda burst: burst.next_start - burst.stop)
    end = last.next_start * FRAME_S - 0.1
    start = max(last.stop * FRAME_S + 0.5, end - 2.0)
    if end - start > 0.5:
        samples = read(round(start * rate), round(end * rate)).astype(float)
        findings.append(tamper.humming(samples, rate, start))
    return [finding for finding in findings if finding is not None]


def _nothing_found(power: Array) -> str:
    levels = stops.level(stops.smoothed(power, 5))
    span = float(np.ptp(np.quantile(levels, [0.02, 0.95]))) if len(levels) else 0.0
    return (
        f"No switch-off is found: the level varies by only {span:.0f} dB. Record steady noise, its "
        "end and the silence after it in one file; for a clap or balloon use --impulse."
    )
