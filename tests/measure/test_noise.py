"""The test signal: equal energy per octave, hard switch-off, and what the cue sheet says."""

import numpy as np
import pytest
import soundfile

from planner.errors import InputError
from planner.measure.noise import (
    cue_sheet,
    lengths_for,
    noise_signal,
    pink_balance,
    pink_noise,
    smallest_distance,
    write_signal,
)

RATE = 48_000


def band_power(samples, low, high, rate=RATE):
    """Power between two frequencies by Parseval's theorem."""
    spectrum = np.abs(np.fft.rfft(samples)) ** 2
    frequency = np.fft.rfftfreq(len(samples), 1 / rate)
    return spectrum[(frequency >= low) & (frequency < high)].sum()


def db(ratio):
    return 10 * np.log10(ratio)


@pytest.mark.parametrize("rate", [44_100, 48_000, 96_000])
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_equal_energy_per_octave(rate, seed):
    """Within ±0.5 dB for octaves and one-third octaves from 50 Hz to 12.5 kHz, in one burst of 4 s."""
    noise = pink_noise(4 * rate, rate, np.random.default_rng(seed))
    for fraction, tolerance in ((1, 0.5), (3, 0.5)):
        ratio = 2 ** (1 / fraction)
        edges = 50.0 * ratio ** np.arange(8 * fraction)
        levels = db(
            np.array([band_power(noise, f, f * ratio, rate) for f in edges if f * ratio <= 12_500])
        )
        assert np.abs(levels - levels.mean()).max() < tolerance


def test_pink_noise_shows_the_same_level_wherever_an_octave_lies():
    """Common practice, no source: 400–800, 750–1500 Hz and 2–4 kHz hold the same level."""
    noise = pink_noise(8 * RATE, RATE, np.random.default_rng(4))
    levels = db(
        np.array([band_power(noise, *band) for band in ((400, 800), (750, 1500), (2000, 4000))])
    )
    assert np.ptp(levels) < 0.1


def test_white_noise_gains_3_db_per_octave():
    """Common practice, no source: the next octave is twice as wide; 8–16 kHz is 8 kHz wide."""
    white = np.random.default_rng(5).standard_normal(20 * RATE)
    gain = db(band_power(white, 2000, 4000) / band_power(white, 1000, 2000))
    assert gain == pytest.approx(3.01, abs=0.1)
    assert db(band_power(white, 8000, 16_000) / band_power(white, 1000, 2000)) == pytest.approx(
        9.03, abs=0.1
    )


def test_samples_are_normally_distributed():
    """Like noise, not like a machine: kurtosis 3 (a normal distribution's)."""
    noise = pink_noise(10 * RATE, RATE, np.random.default_rng(6))
    assert np.mean(noise**4) / np.mean(noise**2) ** 2 == pytest.approx(3.0, abs=0.15)


def test_bursts_are_switched_off_from_one_sample_to_the_next():
    signal = noise_signal(bursts=3, burst_s=2.0, silence_s=1.5, lead_s=0.5)
    assert [start for start, _ in signal.bursts] == pytest.approx([0.5, 4.0, 7.5])
    for start, stop in signal.bursts:
        first, last = round(start * RATE), round(stop * RATE)
        assert np.all(signal.pressure[last : last + RATE] == 0)
        assert np.sqrt(np.mean(signal.pressure[last - 50 : last] ** 2)) > 0.005
        assert np.all(signal.pressure[max(first - 100, 0) : first] == 0)


def test_headroom_and_crest_factor_are_what_they_say():
    signal = noise_signal(headroom_db=6.0)
    peak = np.abs(signal.pressure).max()
    assert 20 * np.log10(peak) == pytest.approx(-6.0, abs=1e-9)
    inside = np.concatenate(
        [signal.pressure[round(a * RATE) : round(b * RATE)] for a, b in signal.bursts]
    )
    assert 20 * np.log10(peak / np.sqrt(np.mean(inside**2))) == pytest.approx(
        signal.crest_db, abs=0.01
    )


def test_the_same_seed_gives_the_same_samples():
    assert np.array_equal(noise_signal(seed=3).pressure, noise_signal(seed=3).pressure)
    assert not np.array_equal(noise_signal(seed=3).pressure, noise_signal(seed=4).pressure)


@pytest.mark.parametrize(("name", "kind"), [("a.wav", "WAV"), ("a.flac", "FLAC")])
def test_files_have_24_bits(tmp_path, name, kind):
    signal = noise_signal(bursts=1, burst_s=1.0, silence_s=0.5)
    info = soundfile.info(write_signal(tmp_path / name, signal))
    assert (info.format, info.subtype) == (kind, "PCM_24")
    read, _ = soundfile.read(tmp_path / name)
    assert np.abs(read - signal.pressure).max() < 2**-23


@pytest.mark.parametrize(
    "wrong",
    [
        {"bursts": 0},
        {"burst_s": 0.2},
        {"silence_s": 0.1},
        {"rate_hz": 8000},
        {"headroom_db": -1},
        {"lead_s": -1},
    ],
    ids=str,
)
def test_signals_that_make_no_measurement_are_refused(wrong):
    with pytest.raises(InputError, match="test signal"):
        noise_signal(**wrong)


def test_a_lossy_file_is_refused(tmp_path):
    with pytest.raises(InputError, match="lossy"):
        write_signal(tmp_path / "a.mp3", noise_signal(bursts=1, burst_s=1, silence_s=1))


def test_the_cue_sheet_fits_the_room():
    """d_min = 2 sqrt(V/(c T)), ISO 3382-1: 60 m³ and 0.3 s give 1.53 m at 343 m/s."""
    assert smallest_distance(60.0, 0.3) == pytest.approx(1.53, abs=0.005)
    signal = noise_signal(burst_s=2.0, silence_s=2.0)
    text = cue_sheet(
        signal, file="pink.wav", room="A room", volume=60.0, expected_s=np.full(8, 0.3)
    )
    assert "1.5 m" in text
    assert "45 dB above the background for T30, 35 dB for T20" in " ".join(text.split())
    assert "ear protection" in text
    assert "enough" in text
    assert len(text.splitlines()) < 62  # one page
    assert "TOO SHORT" in cue_sheet(signal, expected_s=np.full(8, 3.0))
    burst, silence = lengths_for(3.0)
    assert burst >= 3.0
    assert silence >= 3.0


def test_balance_of_pink_and_of_white_noise():
    """Pink is flat; white rises by 3.01 dB per octave (common practice, no source)."""
    bands, level = pink_balance(pink_noise(20 * RATE, RATE, np.random.default_rng(7)), RATE)
    assert np.abs(level).max() < 0.6
    bands, level = pink_balance(np.random.default_rng(8).standard_normal(20 * RATE), RATE)
    assert level == pytest.approx(10 * np.log10(bands / 1000), abs=0.6)
    with pytest.raises(InputError, match="a second of steady noise"):
        pink_balance(np.zeros(RATE * 2), RATE)
