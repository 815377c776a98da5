"""What a recorder, a loudspeaker or a cable did to the signal: each finding with its cure."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.measure.filterbank import BandEnergies
from planner.measure.stops import FRAME_S, level, smoothed

Array = NDArray[np.float64]

FADED_FRAMES = 4
"""By so many frames the first 10 dB of a fade take longer than the next: in a room that falls by 3 dB a
frame, rounding to frames alone makes three. [-]"""

CLIPPED_RUN = 3
"""Equal samples in a row at the largest value that make a clipped peak."""
DRIFT_DB = 1.0
"""Change of level over a burst of steady noise beyond which the gain was ridden. [dB]"""
RISE_DB = 3.0
"""Rise of the noise floor after a decay beyond which a gain control let go. [dB]"""
GATE_S = 0.030
"""Digital silence this long after a decay is a gate. [s]"""
GATE_DROP_DB = 25.0
"""A fall this far within two frames is no decay. [dB]"""
THIN_DB = 18.0
"""A band this far under the 1 kHz band of pink noise was cut away. [dB]"""
HUM_DB = 15.0
"""A mains tone this far above its surroundings spoils a band. [dB]"""
MAINS = (50.0, 60.0)
"""Mains frequencies. [Hz]"""


@dataclass(frozen=True, slots=True)
class Finding:
    """Something that spoils a recording, or part of it."""

    what: str
    """In words, with the figure."""
    cure: str
    """What to change on site."""
    start_s: float
    stop_s: float
    bands_hz: tuple[float, ...] = ()
    """Bands it spoils; empty: all of them."""
    flag: str = ""
    """A word or two for those bands."""
    fatal: bool = False
    """Nothing measured with it may be used."""

    def __str__(self) -> str:
        bands = ""
        if self.bands_hz:
            bands = f" at {', '.join(f'{hz:g}' for hz in self.bands_hz)} Hz"
        place = f"{self.start_s:.1f} to {self.stop_s:.1f} s"
        return f"{self.what}{bands} ({place}). {self.cure}"


def drifting(power: Array, start: int) -> Finding | None:
    """Gain riding: the level of steady noise drifts.

    Parameters
    ----------
    power
        Of one burst without its ends, per `FRAME_S`, shape ``(frame,)``.
    start
        Its first frame in the recording.
    """
    if len(power) < 50:
        return None
    thirds = np.array_split(power, 6)
    means = level(np.array([part.mean() for part in thirds]))
    scatter = np.array(
        [np.std(level(smoothed(part, 5))) / np.sqrt(len(part) / 5) for part in thirds]
    )
    drift = float(means[-1] - means[0])
    if abs(drift) < DRIFT_DB or abs(drift) < 4.0 * float(np.hypot(scatter[0], scatter[-1])):
        return None
    return Finding(
        f"the level of the steady noise drifts by {drift:+.1f} dB: the recorder's gain is ridden",
        "Switch off automatic gain, limiter and noise reduction, and record again.",
        start * FRAME_S,
        (start + len(power)) * FRAME_S,
        fatal=True,
    )


def floor_rising(power: Array, start: int) -> Finding | None:
    """A gain control that lets go: the noise floor rises after the decay.

    `power` runs from the switch-off to the next burst, per `FRAME_S`, shape ``(frame,)``.
    """
    slow = level(smoothed(power, 10))
    if len(slow) < 60:
        return None
    lowest = int(np.argmin(slow[: 3 * len(slow) // 4]))
    tail = slow[lowest:]
    if len(tail) < 30:
        return None
    rise = float(np.median(tail[-10:]) - slow[lowest])
    # Noise alone scatters: the rise must go on, not jump (a door) at the end.
    middle = float(np.median(tail[len(tail) // 2 - 5 : len(tail) // 2 + 5]) - slow[lowest])
    if rise < RISE_DB or middle < 0.3 * rise:
        return None
    return Finding(
        f"the noise floor rises by {rise:.0f} dB after the decay: a gain control lets go",
        "Switch off automatic gain and noise reduction, and record again.",
        start * FRAME_S,
        (start + len(power)) * FRAME_S,
        fatal=True,
    )


def gated(power: Array, start: int) -> Finding | None:
    """A gate: the decay drops into digital silence, or all at once.

    `power` runs from the switch-off to the next burst, per `FRAME_S`, shape ``(frame,)``.
    """
    cure = "Switch off the gate, noise reduction or 'voice' mode of the recorder."
    silent = np.flatnonzero(power <= 1e-14)
    if len(silent) * FRAME_S >= GATE_S:
        at = (start + int(silent[0])) * FRAME_S
        return Finding(
            "the decay ends in digital silence: a gate or noise reduction cut it off",
            cure, at, at + len(silent) * FRAME_S, fatal=True,
        )  # fmt: skip
    levels = level(power)
    if len(levels) < 8:
        return None
    falls = levels[:-2] - levels[2:]
    worst = int(np.argmax(falls))
    if falls[worst] > GATE_DROP_DB and worst > 2:  # before that the direct sound ends
        at = (start + worst) * FRAME_S
        return Finding(
            f"the level drops by {falls[worst]:.0f} dB at once in the decay: a gate cut it off",
            cure, at, at + 2 * FRAME_S, fatal=True,
        )  # fmt: skip
    return None


def fading(power: Array, start: int) -> Finding | None:
    """Noise that was faded out: the fall begins slowly and grows steeper, as no room does.

    `power` runs from the switch-off to the next burst, per `FRAME_S`, shape ``(frame,)``.
    """
    levels = level(power)
    first = levels[:3].max() if len(levels) else 0.0
    fall = first - levels
    begun = np.flatnonzero(fall > 3.0)
    # The stretch given may begin a few frames before the fall does.
    still = np.flatnonzero(fall[: begun[0]] < 1.0) if len(begun) else begun
    fall = fall[int(still[-1]) if len(still) else 0 :]
    marks = []
    for depth in (3.0, 10.0, 20.0):
        beyond = np.flatnonzero(fall > depth)
        if not len(beyond):
            return None
        marks.append(int(beyond[0]))
    early, late = marks[1], marks[2] - marks[1]
    if early * FRAME_S < 0.05 or early < 1.6 * max(late, 1) or early - late < FADED_FRAMES:
        return None
    return Finding(
        f"the noise was faded out over {marks[1] * FRAME_S:.2f} s, not switched off",
        "Stop the noise from one sample to the next: use the planner's own test signal.",
        start * FRAME_S,
        (start + marks[2]) * FRAME_S,
        fatal=True,
    )


def thin_bands(steady: BandEnergies) -> Finding | None:
    """Bands far under the pink slope: a low-cut, a small loudspeaker or a lossy format.

    `steady` holds the energies of steady noise; pink noise has equal ones in every octave.
    """
    levels = level(steady.energy.mean(axis=0))
    nominal = np.array(steady.bands.nominal)
    if not np.any(nominal == 1000.0):
        return None
    below = levels - levels[int(np.flatnonzero(nominal == 1000.0)[0])]
    missing = tuple(float(hz) for hz in nominal[below < -THIN_DB])
    if not missing:
        return None
    return Finding(
        f"the noise lies {-float(below.min()):.0f} dB under what pink noise would have, reckoned from the "
        "1 kHz band,",
        "Switch off low-cut and 'voice' modes of the recorder, or use a larger loudspeaker.",
        steady.begin_s,
        steady.begin_s + len(steady.energy) * steady.frame_s,
        bands_hz=missing,
        flag="hardly any sound in this band",
    )


def humming(samples: Array, rate: float, start_s: float) -> Finding | None:
    """Mains hum in the noise floor.

    Parameters
    ----------
    samples
        The floor, half a second or more, shape ``(sample,)``.
    rate, start_s
        [Hz], where it begins [s].
    """
    if len(samples) < 0.4 * rate:
        return None
    spectrum = np.abs(np.fft.rfft(samples * np.hanning(len(samples)))) ** 2
    width = rate / len(samples)

    def around(hertz: float) -> float:
        middle = round(hertz / width)
        near = spectrum[max(middle - 2, 0) : middle + 3].max()
        sides = np.concatenate(
            [
                spectrum[max(middle - round(20 / width), 1) : max(middle - 4, 2)],
                spectrum[middle + 5 : middle + round(20 / width)],
            ]
        )
        reference = float(np.median(sides)) if len(sides) else 0.0
        return float(10 * np.log10(near / reference)) if reference > 0 else 0.0

    for mains in MAINS:
        tones = [around(mains * harmonic) for harmonic in (1, 2, 3)]
        # One tone may be a ventilator; mains hum brings its harmonics, or is overwhelming.
        if max(tones) > HUM_DB + 10 or sum(tone > HUM_DB for tone in tones) >= 2:
            bands = tuple(
                hz for hz, tone in ((63.0, tones[0]), (125.0, max(tones[1:]))) if tone > HUM_DB
            )
            return Finding(
                f"mains hum of {mains:g} Hz stands {max(tones):.0f} dB out of the noise floor",
                "Run the recorder from its battery, and keep cables away from mains leads.",
                start_s,
                start_s + len(samples) / rate,
                bands_hz=bands,
                flag="mains hum",
            )
    return None
