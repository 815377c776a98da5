"""The pink-noise test signal: bursts and silences, seeded, and what to do with it on site."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.errors import InputError

Array = NDArray[np.float64]

LOWEST_HZ, HIGHEST_HZ = 35.0, 18_000.0
"""The noise is flat per octave between these; less excursion for the loudspeaker below. [Hz]"""

EDGE = 1.25
"""Ratio over which it fades out beyond them. [-]"""

FORMATS = {".wav": ("WAV", "PCM_24"), ".flac": ("FLAC", "PCM_24")}


@dataclass(frozen=True, slots=True)
class NoiseSignal:
    """A signal to play on site."""

    pressure: Array
    """Shape ``(sample,)``, full scale is 1."""
    rate_hz: int
    bursts: tuple[tuple[float, float], ...]
    """Beginning and end of each burst. [s]"""
    seed: int
    crest_db: float
    """Peak over root mean square of the noise. [dB]"""
    headroom_db: float
    """Full scale over peak. [dB]"""

    @property
    def duration_s(self) -> float:
        """[s]."""
        return len(self.pressure) / self.rate_hz

    def to_json(self) -> dict[str, Any]:
        """What ``planner noise --json`` prints."""
        return {
            "bursts": [{"start_s": start, "stop_s": stop} for start, stop in self.bursts],
            "rate_hz": self.rate_hz,
            "seed": self.seed,
            "duration_s": self.duration_s,
            "crest_db": self.crest_db,
            "headroom_db": self.headroom_db,
        }


def pink_noise(length: int, rate_hz: float, rng: np.random.Generator) -> Array:
    """Noise of equal energy in every octave between 35 Hz and 18 kHz.

    Parameters
    ----------
    length
        Number of samples. [-]
    rate_hz
        Sampling rate; above 0.45 of it the noise fades out too. [Hz]
    rng
        Where the phases come from.

    Returns
    -------
    pressure
        Shape ``(length,)``, root mean square 1. The magnitude of each spectral line is exact and
        only its phase is random, so that even one burst is pink to a fraction of a decibel; the
        samples are normally distributed all the same.
    """
    frequency = np.fft.rfftfreq(length, 1.0 / rate_hz)
    highest = min(HIGHEST_HZ, 0.45 * rate_hz)
    with np.errstate(divide="ignore"):
        position = np.log2(np.maximum(frequency, 1e-9))
    fade = np.log2(EDGE)
    up = np.clip((position - np.log2(LOWEST_HZ)) / fade + 1.0, 0.0, 1.0)
    down = np.clip((np.log2(highest) - position) / fade + 1.0, 0.0, 1.0)
    magnitude = np.sin(0.5 * np.pi * up) * np.sin(0.5 * np.pi * down)
    magnitude[1:] /= np.sqrt(frequency[1:])
    magnitude[0] = 0.0
    if length % 2 == 0:
        magnitude[-1] = 0.0
    phase = rng.uniform(0.0, 2.0 * np.pi, len(frequency))
    noise = np.fft.irfft(magnitude * np.exp(1j * phase), length)
    unit: Array = noise / np.sqrt(np.mean(noise**2))
    return unit


def noise_signal(
    *,
    bursts: int = 4,
    burst_s: float = 4.0,
    silence_s: float = 4.0,
    lead_s: float = 1.0,
    rate_hz: int = 48_000,
    seed: int = 1,
    headroom_db: float = 3.0,
) -> NoiseSignal:
    """Bursts of pink noise, each switched off from one sample to the next.

    Parameters
    ----------
    bursts
        How many decays. [-]
    burst_s
        Length of each burst: longer than the reverberation time, and a second at least. [s]
    silence_s
        Length of the silence after each: longer than the reverberation time. [s]
    lead_s
        Silence before the first. [s]
    rate_hz, seed, headroom_db
        [Hz], [-], [dB]

    Raises
    ------
    InputError
        A length or count that makes no measurement.
    """
    for value, low, high, name, cure in (
        (bursts, 1, 100, "bursts", "Three or more give a useful average."),
        (burst_s, 1.0, 60.0, "burst length (s)", "A room needs a second to settle."),
        (silence_s, 0.5, 60.0, "silence (s)", "The decay needs time to reach the noise floor."),
        (lead_s, 0.0, 60.0, "lead (s)", "A second lets the recorder settle."),
        (rate_hz, 16_000, 192_000, "sampling rate (Hz)", "48000 is usual."),
        (headroom_db, 0.0, 40.0, "headroom (dB)", "3 dB is usual."),
    ):
        if not low <= value <= high:
            raise InputError(
                f"{value:g} is no {name} for a test signal ({low:g} to {high:g})", cure=cure
            )
    rng = np.random.default_rng(seed)
    on, off, lead = round(burst_s * rate_hz), round(silence_s * rate_hz), round(lead_s * rate_hz)
    pressure = np.zeros(lead + bursts * (on + off))
    places = [(lead + n * (on + off), lead + n * (on + off) + on) for n in range(bursts)]
    for start, stop in places:
        pressure[start:stop] = pink_noise(on, rate_hz, rng)
    peak = float(np.max(np.abs(pressure)))
    return NoiseSignal(
        pressure=pressure * 10.0 ** (-headroom_db / 20.0) / peak,
        rate_hz=rate_hz,
        bursts=tuple((start / rate_hz, stop / rate_hz) for start, stop in places),
        seed=seed,
        crest_db=20.0 * float(np.log10(peak)),
        headroom_db=headroom_db,
    )


def write_signal(path: str | Path, signal: NoiseSignal) -> Path:
    """Write a test signal as WAV or FLAC, 24 bit, atomically.

    Raises
    ------
    InputError
        The ending is neither ``.wav`` nor ``.flac``, or the place cannot be written to.
    """
    import io

    import soundfile

    from planner.storage import write_atomically

    target = Path(path)
    if target.suffix.lower() not in FORMATS:
        raise InputError(
            f"{target.suffix or 'no ending'} is no format for a test signal",
            file=target,
            cure="Name it .wav or .flac: a lossy file would change the noise.",
        )
    kind, subtype = FORMATS[target.suffix.lower()]
    buffer = io.BytesIO()
    soundfile.write(buffer, signal.pressure, signal.rate_hz, format=kind, subtype=subtype)
    return write_atomically(target, buffer.getvalue())


def smallest_distance(volume: float, reverberation_time: float, speed: float = 343.0) -> float:
    """Least distance between source and microphone, 2 sqrt(V / (c T)) (ISO 3382-1:2009). [m]."""
    return float(2.0 * np.sqrt(volume / (speed * reverberation_time)))


def lengths_for(longest_s: float) -> tuple[float, float]:
    """Burst and silence for an expected longest reverberation time, in whole half seconds. [s].

    At least 2 s of noise and the time itself; the silence holds the decay and half a second of
    noise floor. Common practice around the minimum of ISO 3382-2 (from memory).
    """
    burst = max(2.0, np.ceil(2.0 * (longest_s + 0.5)) / 2.0)
    silence = max(2.0, np.ceil(2.0 * (1.3 * longest_s + 0.5)) / 2.0)
    return float(burst), float(silence)


def cue_sheet(
    signal: NoiseSignal,
    *,
    file: str = "",
    room: str = "",
    volume: float | None = None,
    expected_s: NDArray[np.float64] | None = None,
) -> str:
    """One page of plain text: what to play, how loud, where to stand, what to mind.

    Parameters
    ----------
    signal
        The test signal.
    file
        Its name.
    room
        Name of the room.
    volume
        Of the room. [m³]
    expected_s
        Predicted reverberation time over `planner.bands.OCTAVES`. [s]
    """
    lines = [
        f"CUE SHEET{' - ' + room if room else ''}",
        "",
        f"Signal    {file or 'test signal'}: {len(signal.bursts)} bursts of pink noise, "
        f"{signal.rate_hz / 1000:g} kHz, seed {signal.seed}",
        f"Level     crest factor {signal.crest_db:.1f} dB, peak {signal.headroom_db:.1f} dB under "
        "full scale",
        "",
        "Burst     starts (s)   stops (s)",
        *(
            f"{number:>5}     {start:>10.2f}   {stop:>9.2f}"
            for number, (start, stop) in enumerate(signal.bursts, 1)
        ),
        "",
        *_lengths(signal, expected_s),
        "HOW LOUD",
        "  Each octave band at least 45 dB above the background for T30, 35 dB for T20",
        "  (ISO 3382-2). Switch ventilation and other noise off. Start low and turn up: tweeters",
        "  burn before they sound loud. Leave the level alone from the first burst to the last.",
        "",
        "RECORDER",
        "  WAV or FLAC, 44.1 or 48 kHz. Switch off automatic gain, limiter, noise reduction,",
        "  low-cut and every 'voice' mode. Peaks near -12 dB of full scale, never at full scale.",
        "  Keep recording for a second after the last decay.",
        "",
        *_positions(volume, expected_s),
        "MIND",
        "  Hearing: noise this loud harms. Wear ear protection or leave the room while it plays",
        "  (85 dBA for 8 h, 94 dBA for 1 h, 100 dBA for 15 min are limits at work). Warn neighbours.",
        "  Cables and stands: nothing to trip over, nothing that falls. Local rules come first.",
    ]
    return "\n".join(lines) + "\n"


def _lengths(signal: NoiseSignal, expected_s: Array | None) -> list[str]:
    if expected_s is None or not np.isfinite(expected_s).any():
        return []
    longest = float(np.nanmax(np.where(np.isfinite(expected_s), expected_s, np.nan)))
    burst, silence = lengths_for(longest)
    start, stop = signal.bursts[0]
    gap = signal.bursts[1][0] - stop if len(signal.bursts) > 1 else signal.duration_s - stop
    enough = stop - start >= burst and gap >= silence
    return [
        "LENGTHS",
        f"  Longest predicted reverberation time {longest:.2f} s: bursts of {burst:g} s and silences "
        f"of {silence:g} s or more.",
        f"  This signal has {stop - start:g} s and {gap:g} s: "
        + ("enough." if enough else "TOO SHORT, make a longer one."),
        "",
    ]


def _positions(volume: float | None, expected_s: Array | None) -> list[str]:
    lines = [
        "WHERE",
        "  Loudspeaker: in a corner or 1.5 m up, facing away from the microphone; two positions.",
        "  Microphone: 1.2 m up, 1 m from walls, 2 m from each other where the room allows;",
        "  three positions for each of the two: six recordings make the engineering grade",
        "  (ISO 3382-2, from memory), two bursts each at least.",
    ]
    if volume is not None and expected_s is not None and np.isfinite(expected_s).any():
        middle = [hz in (500, 1000) for hz in OCTAVES]
        time = float(np.nanmean(expected_s[middle]))
        lines.append(
            f"  Loudspeaker to microphone at least {smallest_distance(volume, time):.1f} m "
            "(2 sqrt(V/(c T)), ISO 3382-1)."
        )
    return [*lines, ""]


def pink_balance(samples: Array, rate_hz: float, *, fraction: int = 1) -> tuple[Array, Array]:
    """How far a recording or a loudspeaker is from pink: level per band against that of 1 kHz.

    Parameters
    ----------
    samples
        Steady noise of a second or more, shape ``(sample,)``.
    rate_hz
        [Hz]
    fraction
        1 for octaves, 3 for one-third octaves.

    Returns
    -------
    bands_hz, level_db
        Nominal midbands that the rate carries [Hz], and their level less that of the 1 kHz band;
        0 everywhere for pink noise. [dB]

    Raises
    ------
    InputError
        The samples are too short or silent.
    """
    from planner.measure.filterbank import OCTAVE_BANDS, THIRD_BANDS, band_energies

    if len(samples) < rate_hz or not np.any(samples):
        raise InputError(
            "a second of steady noise is needed to judge its balance",
            cure="Record the noise while it is playing.",
        )
    bands = (THIRD_BANDS if fraction == 3 else OCTAVE_BANDS).offered(rate_hz)
    frames = band_energies(np.asarray(samples), rate_hz, bands, frame_s=0.1).energy
    # The first and last frame hold the filters' own start and end.
    power = frames[1:-1].mean(axis=0)
    level = 10.0 * np.log10(np.maximum(power, 1e-20))
    return np.array(bands.nominal), level - level[bands.nominal.index(1000.0)]
