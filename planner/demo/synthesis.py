"""Site recordings of a room that does not exist: pink noise through simulated responses.

Enters: a rectangular room with the coefficients it "really" has. Leaves: interrupted-noise
recordings, one for each pair of source and microphone, with background noise, seeded.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.air import Air
from planner.bands import OCTAVES

RATE = 48_000
"""Sampling rate of the recordings. [Hz]"""

BACKGROUND_DB = (-34.0, -44.0, -50.0, -54.0, -58.0, -60.0, -62.0, -64.0)
"""Background noise against the noise in the room, per octave: ventilation rumbles. [dB]"""

SCATTERING = 0.35
"""Scattering of every surface: a furnished-out shell with studs and reveals; assumed. [-]"""


@dataclass(frozen=True, slots=True)
class Shell:
    """A rectangular room as the simulation takes it."""

    dimensions: tuple[float, float, float]
    """[m]"""
    alpha: Mapping[str, Sequence[float]]
    """Mean coefficient of each of the six surfaces, per octave. [-]"""
    air: Air


def responses(
    shell: Shell,
    source: Sequence[float],
    microphones: Sequence[Sequence[float]],
    *,
    seed: int,
    rays: int = 6000,
) -> list[NDArray[np.float64]]:
    """Impulse responses from one source to several microphones.

    Image sources to the third order and ray tracing beyond, in octaves from 63 Hz. The library's
    octave grid and threads are global settings; they are put back as they were found.
    """
    import pyroomacoustics as pra

    settings = {"octave_bands_base_freq": 62.5, "num_threads": 1}  # one thread: same bits each time
    before = {name: pra.constants.get(name) for name in settings}
    for name, value in settings.items():
        pra.constants.set(name, value)
    pra.random.seed(seed)
    try:
        room = pra.ShoeBox(
            list(shell.dimensions),
            fs=RATE,
            materials={
                name: pra.Material(
                    {"coeffs": list(shell.alpha[surface]), "center_freqs": _CENTRES},
                    {"coeffs": [SCATTERING], "center_freqs": [1000.0]},
                )
                for name, surface in _SIDES.items()
            },
            max_order=3,
            ray_tracing=True,
            air_absorption=True,
            temperature=shell.air.temperature_c,
            humidity=shell.air.humidity_percent,
        )
        room.set_ray_tracing(n_rays=rays, energy_thres=1e-12, receiver_radius=0.3)
        room.add_source(list(source))
        room.add_microphone_array(np.array(microphones, float).T)
        room.compute_rir()
        return [np.asarray(row[0], float) for row in room.rir]
    finally:
        for name, value in before.items():
            pra.constants.set(name, value)


_CENTRES = [62.5 * 2**n for n in range(len(OCTAVES))]
# The library's names for the walls of its box, and ours: x runs from front to back.
_SIDES = {
    "west": "front",
    "east": "back",
    "south": "left",
    "north": "right",
    "floor": "floor",
    "ceiling": "ceiling",
}


def recording(
    response: NDArray[np.float64],
    *,
    seed: int,
    bursts: int = 4,
    burst_s: float = 2.5,
    silence_s: float = 2.5,
) -> NDArray[np.float64]:
    """Interrupted pink noise as a recorder in the room would have taken it.

    Parameters
    ----------
    response
        Impulse response from loudspeaker to microphone, shape ``(sample,)``.
    seed
        Of the noise and the background.
    bursts, burst_s, silence_s
        How often, how long the noise and how long the silence after it. [-], [s], [s]

    Returns
    -------
    pressure
        Shape ``(sample,)``, peak at −6 dB of full scale.
    """
    from scipy.signal import fftconvolve

    rng = np.random.default_rng(seed)
    on, off = round(burst_s * RATE), round(silence_s * RATE)
    lead = RATE // 2
    noise = _coloured(lead + bursts * (on + off), rng, np.zeros(len(OCTAVES)))
    gate = np.zeros(len(noise))
    for burst in range(bursts):
        start = lead + burst * (on + off)
        gate[start : start + on] = 1.0
    heard: NDArray[np.float64] = fftconvolve(noise * gate, response)[: len(noise)]
    steady = heard[lead + on // 2 : lead + on]
    heard /= np.sqrt(np.mean(steady**2))
    heard += _coloured(len(heard), rng, np.array(BACKGROUND_DB))
    heard *= 0.5 / np.max(np.abs(heard))
    return heard


def _coloured(
    length: int, rng: np.random.Generator, octave_db: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Noise of unit power spread equally over the octaves, each then set by `octave_db`."""
    spectrum = np.fft.rfft(rng.standard_normal(length))
    frequency = np.fft.rfftfreq(length, 1.0 / RATE)
    pink = np.zeros(len(frequency))
    audible = (frequency > 35.0) & (frequency < 20_000.0)
    pink[audible] = frequency[audible] ** -0.5
    shape = 10.0 ** (
        np.interp(np.log2(np.maximum(frequency, 1.0)), np.log2(OCTAVES), octave_db) / 20
    )
    reference = np.fft.irfft(spectrum * pink, length)
    noise: NDArray[np.float64] = np.fft.irfft(spectrum * pink * shape, length)
    noise /= np.sqrt(np.mean(reference**2))
    return noise
