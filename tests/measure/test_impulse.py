"""Impulses: two real rooms against an independent library, and synthetic ones of known time."""

from pathlib import Path

import numpy as np
import pytest

from planner.errors import RecordingError
from planner.measure.decay import Decays, evaluate_decays
from planner.measure.filterbank import OCTAVE_BANDS, section_energies
from planner.measure.impulse import evaluate_impulse, onset, truncation

# Reverberation times by pyfar 0.8.1 and pyrato 1.1.0 (noise-compensated backward integration),
# forward and time-reversed filters, from the README beside the two recordings. [s]
GALLERY = {
    "t20_s": {250: (0.42, 0.45), 500: (0.52, 0.52), 1000: (0.59, 0.59), 2000: (0.52, 0.52),
              4000: (0.47, 0.47), 8000: (0.39, 0.39)},
    "t30_s": {250: (0.45, 0.50), 500: (0.58, 0.59), 1000: (0.58, 0.59), 2000: (0.53, 0.53),
              4000: (0.49, 0.49), 8000: (0.41, 0.41)},
}  # fmt: skip
CLAP = {
    "t20_s": {500: (0.86, 0.86), 1000: (0.74, 0.74), 2000: (0.65, 0.65), 4000: (0.54, 0.54),
              8000: (0.46, 0.46)},
    "t30_s": {1000: (0.76, 0.76), 2000: (0.66, 0.66), 4000: (0.55, 0.55), 8000: (0.46, 0.46)},
}  # fmt: skip


def evaluated(path: Path) -> Decays:
    import soundfile

    samples, rate = soundfile.read(path)
    return evaluate_impulse(lambda a, b: samples[a:b], rate, 0, len(samples))


@pytest.mark.parametrize(
    ("file", "table"),
    [("pyfar_gallery_room_ir.wav", GALLERY), ("seminar_room_clap.wav", CLAP)],
)
def test_real_rooms_agree_with_an_independent_library(recordings_dir, file, table):
    """Within 5 % from 500 Hz up and 10 % at 250 Hz of either filter direction (its README)."""
    decays = evaluated(recordings_dir / file)
    for name, bands in table.items():
        for nominal, values in bands.items():
            got = decays.column(name)[OCTAVE_BANDS.nominal.index(nominal)]
            allowed = 0.10 if nominal == 250 else 0.05
            assert min(abs(got / value - 1.0) for value in values) < allowed, (name, nominal, got)


def test_bands_of_the_clap_that_drown_in_noise_are_refused(recordings_dir):
    """125 Hz and 250 Hz (27 dB of range) give no figure but a reason in dB."""
    decays = evaluated(recordings_dir / "seminar_room_clap.wav")
    for index in (0, 1, 2):
        band = decays.each[index]
        assert np.isnan(band.t_s)
        assert "refused" in band.flags
        assert band.reason
    assert 24.0 < decays.each[2].range_db < 30.0
    assert "T15 needs 30 dB" in decays.each[2].reason


def test_the_bent_band_of_the_gallery_room_is_flagged(recordings_dir):
    """The README beside the recording calls its 125 Hz decay curved."""
    decays = evaluated(recordings_dir / "pyfar_gallery_room_ir.wav")
    assert "curved" in decays.each[1].flags


def synthetic(time_s, snr_db, seed, rate=16000, seconds=3.0):
    """Noise that decays exponentially after half a second, in steady noise."""
    rng = np.random.default_rng(seed)
    t = np.arange(int(seconds * rate)) / rate - 0.5
    decay = np.where(t >= 0.0, 10.0 ** (-3.0 * np.maximum(t, 0.0) / time_s), 0.0)
    return decay * rng.standard_normal(len(t)) + 10.0 ** (-snr_db / 20.0) * rng.standard_normal(
        len(t)
    )


@pytest.mark.parametrize("snr_db", [50.0, 65.0])
def test_synthetic_impulse_responses_come_out_at_their_time(snr_db):
    """T = 0.6 s; a T30 of one noise decay scatters by 0.55·sqrt(1/(B·T)): 2.3 % at 1 kHz.

    (ISO 3382-2:2008, annex A, without the part that averaging removes.)
    """
    times = []
    for seed in range(8):
        signal = synthetic(0.6, snr_db, seed)
        decays = evaluate_impulse(lambda a, b, s=signal: s[a:b], 16000, 0, len(signal),
                                  OCTAVE_BANDS.offered(16000))  # fmt: skip
        times.append(decays.column("t30_s")[4:])
    assert np.mean(times, axis=0) == pytest.approx(0.6, rel=0.03)


def test_the_truncation_point_lies_where_decay_and_noise_meet():
    """Exponential of T = 0.5 s that starts 50 dB above the noise: they meet at 50/60·0.5 s."""
    rng = np.random.default_rng(5)
    time = (np.arange(2000) + 0.5) * 1e-3
    power = 10.0 ** (-6.0 * time / 0.5) + 1e-5
    found = truncation(time, power * rng.gamma(8.0, 1 / 8.0, len(time)))
    assert found is not None
    assert found.time_s == pytest.approx(50.0 / 60.0 * 0.5, rel=0.05)
    assert found.late_s == pytest.approx(0.5, rel=0.1)
    assert found.noise == pytest.approx(1e-5, rel=0.05)


def test_the_onset_is_20_db_under_the_peak():
    """ISO 3382-1:2009, A.3.4."""
    samples = np.zeros(1000)
    samples[400] = 0.09  # 20.9 dB under
    samples[500] = 0.11  # 19.2 dB under
    samples[510] = 1.0
    assert onset(samples) == 500


def test_silence_is_refused():
    with pytest.raises(RecordingError, match="silence"):
        evaluate_impulse(lambda a, b: np.zeros(b - a), 48000, 0, 48000)


def interrupted_in_gallery(response, rate, count, seed):
    """Pink noise, switched off after 2 s, played through a response, 50 dB above a noise floor."""
    from scipy.signal import fftconvolve

    rng = np.random.default_rng(seed)
    length, stop = int(4.5 * rate), 2 * rate
    shape = np.fft.rfftfreq(length, 1.0 / rate)
    shape[0] = np.inf
    arrival = onset(response)
    bursts = []
    for _ in range(count):
        pink = np.fft.irfft(np.fft.rfft(rng.standard_normal(length)) / np.sqrt(shape), length)
        pink[stop:] = 0.0
        played = fftconvolve(pink, response)[:length]
        steady = np.std(played[rate:stop])
        played += steady * 10.0**-2.5 * rng.standard_normal(length)
        bursts.append(
            section_energies(lambda a, b, s=played: s[a:b], rate, rate, length - rate // 4,
                             origin=stop + arrival)
        )  # fmt: skip
    return bursts


def test_interrupted_noise_and_impulse_response_agree_within_their_uncertainty(recordings_dir):
    """The ensemble mean of interrupted noise is the backward integral (Schroeder 1965)."""
    import soundfile

    response, rate = soundfile.read(recordings_dir / "pyfar_gallery_room_ir.wav")
    direct = evaluated(recordings_dir / "pyfar_gallery_room_ir.wav")
    noise = evaluate_decays(interrupted_in_gallery(response, rate, 6, seed=1))
    bands = slice(1, None)  # the sweep began at 50 Hz: the README gives no value at 63 Hz
    difference = noise.column("t_s")[bands] - direct.column("t_s")[bands]
    both = np.hypot(noise.column("u_s")[bands], direct.column("u_s")[bands])
    assert np.all(np.abs(difference) < 2.0 * both)
    for nominal, values in GALLERY["t30_s"].items():
        index = OCTAVE_BANDS.nominal.index(nominal)
        # 5 % (10 % at 250 Hz) between the two libraries, two u of the noise on top
        allowed = 0.10 if nominal == 250 else 0.05
        band = noise.each[index]
        least = min(abs(band.t_s - value) for value in values)
        assert least < allowed * band.t_s + 2.0 * band.u_s, nominal


@pytest.mark.parametrize("file", ["pyfar_gallery_room_ir.wav", "seminar_room_clap.wav"])
def test_another_filter_bank_with_plain_backward_integration_agrees(recordings_dir, file):
    """The filters of pyfar, integrated backwards from the noise, without compensation.

    T20 from 500 Hz up within 5 %: what its order-14 filters and a plain cut may differ.
    """
    import pyfar
    import soundfile

    samples, rate = soundfile.read(recordings_dir / file)
    ours = evaluate_impulse(lambda a, b: samples[a:b], rate, 0, len(samples))
    begin = onset(samples)
    signal = pyfar.Signal(samples, rate)
    filtered = pyfar.dsp.filter.fractional_octave_bands(
        signal, 1, frequency_range=(500, 8000)
    ).time[:, 0]
    for nominal, band in zip((500, 1000, 2000, 4000, 8000), filtered, strict=True):
        squared = band[begin:] ** 2
        noise = squared[int(0.9 * len(squared)) :].mean()
        smooth = np.convolve(squared, np.ones(rate // 50) / (rate // 50), "same")
        end = int(np.argmax(smooth < 3.0 * noise))
        decay = np.cumsum(squared[:end][::-1])[::-1]
        level = 10.0 * np.log10(decay / decay[0])
        first, last = np.argmax(level < -5.0), np.argmax(level < -25.0)
        slope = np.polyfit(np.arange(first, last) / rate, level[first:last], 1)[0]
        got = ours.column("t20_s")[OCTAVE_BANDS.nominal.index(nominal)]
        assert got == pytest.approx(-60.0 / slope, rel=0.05), nominal
