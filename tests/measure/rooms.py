"""Recordings of rooms that do not exist, made in the test: noise that decays exponentially."""

import numpy as np
import soundfile


def pink(length, rate, rng, lowest=30.0):
    """Pink noise by shaping a white spectrum, independent of the package; unit power."""
    spectrum = np.fft.rfft(rng.standard_normal(length))
    frequency = np.fft.rfftfreq(length, 1 / rate)
    spectrum[1:] /= np.sqrt(frequency[1:])
    spectrum[frequency < lowest] = 0
    noise = np.fft.irfft(spectrum, length)
    return noise / np.sqrt(np.mean(noise**2))


def response(time_s, rate, rng, direct=0.0):
    """Exponentially decaying white noise; `direct` is the energy of a first pulse against the rest."""
    length = int(1.3 * time_s * rate)
    t = np.arange(length) / rate
    h = rng.standard_normal(length) * 10 ** (-3 * t / time_s)
    h /= np.sqrt(np.sum(h**2))
    h[0] += np.sqrt(direct)
    return h


def interrupted(
    time_s=0.5,
    rate=44_100,
    snr_db=50.0,
    bursts=2,
    on_s=2.5,
    off_s=None,
    seed=0,
    lead_s=0.5,
    direct=0.0,
):
    """Samples of bursts of pink noise in a room of that reverberation time, and where they stop [s]."""
    from scipy.signal import fftconvolve

    rng = np.random.default_rng(seed)
    off_s = off_s or max(1.5, 1.5 * time_s)
    on, off, lead = int(on_s * rate), int(off_s * rate), int(lead_s * rate)
    length = lead + bursts * (on + off)
    gate = np.zeros(length)
    stops = []
    for n in range(bursts):
        start = lead + n * (on + off)
        gate[start : start + on] = 1
        stops.append((start + on) / rate)
    heard = fftconvolve(pink(length, rate, rng) * gate, response(time_s, rate, rng, direct))[
        :length
    ]
    steady = heard[lead + on // 2 : lead + on]
    heard /= np.sqrt(np.mean(steady**2))
    heard += 10 ** (-snr_db / 20) * pink(length, rate, rng)
    return 0.4 * heard / np.max(np.abs(heard)), stops


def write(path, samples, rate=44_100, subtype="PCM_24", **options):
    soundfile.write(path, samples, rate, subtype=subtype, **options)
    return path
