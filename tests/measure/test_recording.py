"""Recordings good and bad: what is found, what is refused, in which words."""

import struct
import sys
from pathlib import Path

import numpy as np
import pytest
import soundfile

from planner.errors import RecordingError
from planner.measure.decay import evaluate_decays
from planner.measure.measurement import measure
from planner.measure.recording import read_recording
from planner.measure.stops import regular

sys.path.insert(0, str(Path(__file__).parent))
from rooms import interrupted, pink, response, write

RATE = 44_100


@pytest.fixture(scope="module")
def clean():
    """Half a second of reverberation, two bursts, 50 dB above the background."""
    return interrupted(time_s=0.5, seed=1)


def words(recording):
    return " ".join(recording.warnings)


@pytest.mark.parametrize("time_s", [0.2, 0.5, 1.0, 2.0])
@pytest.mark.parametrize("snr_db", [30, 50])
def test_clean_recordings_raise_no_alarm_and_give_the_time(tmp_path, time_s, snr_db):
    """The true time is known: exponentially decaying noise. 1 kHz band, 95 % interval and 6 %."""
    samples, stops = interrupted(
        time_s=time_s, snr_db=snr_db, on_s=max(2.5, 2 * time_s), seed=round(10 * time_s)
    )
    recording = read_recording(write(tmp_path / "a.wav", samples))
    assert len(recording.stops_s) == len(stops)
    assert not recording.findings
    # Within 2 ms for short decays; a corner in 20 dB/s cannot be seen more sharply than this.
    assert np.abs(np.array(recording.stops_s) - stops).max() < 0.004 + 0.012 * time_s
    band = next(b for b in evaluate_decays(recording.bursts).each if b.band_hz == 1000)
    assert band.t_s == pytest.approx(time_s, rel=0.06, abs=3 * band.u_s)


@pytest.mark.parametrize("rate", [16_000, 44_100, 48_000, 96_000])
def test_rates(tmp_path, rate):
    samples, stops = interrupted(rate=rate, seed=3)
    recording = read_recording(write(tmp_path / "a.wav", samples, rate))
    assert np.allclose(recording.stops_s, stops, atol=0.012)
    if rate == 16_000:
        assert "8000 Hz: not recorded" in words(recording)


@pytest.mark.parametrize(
    ("name", "options"),
    [
        ("a.wav", {"subtype": "PCM_16"}),
        ("a.wav", {"subtype": "FLOAT"}),
        ("b.wav", {"format": "WAVEX", "subtype": "PCM_24"}),
        ("a.rf64", {"format": "RF64"}),
        ("a.w64", {"format": "W64"}),
        ("a.aiff", {}),
        ("a.caf", {}),
        ("a.flac", {}),
    ],
    ids=lambda value: str(value),
)
def test_formats(tmp_path, clean, name, options):
    samples, stops = clean
    path = tmp_path / name
    write(path, samples, **options)
    assert np.allclose(read_recording(path).stops_s, stops, atol=0.012)


def test_a_lossy_file_is_measured_with_a_warning(tmp_path, clean):
    path = tmp_path / "a.ogg"
    soundfile.write(path, clean[0], RATE, format="OGG", subtype="VORBIS")
    assert "lossy" in words(read_recording(path))


def test_float_above_full_scale_is_hot_not_clipped(tmp_path, clean):
    recording = read_recording(write(tmp_path / "a.wav", 4 * clean[0], subtype="FLOAT"))
    assert len(recording.bursts) == 2
    assert not recording.findings


# Broken files -------------------------------------------------------------------------------------


def damaged(path, samples, where, value):
    """A WAV with a field of its header overwritten."""
    write(path, samples, subtype="PCM_16")
    data = bytearray(path.read_bytes())
    at = data.index(b"data") + 4 if where == "data" else 4
    data[at : at + 4] = struct.pack("<I", value)
    path.write_bytes(bytes(data))
    return path


@pytest.mark.parametrize("value", [0, 0xFFFFFFFF])
def test_a_header_without_a_length_is_repaired(tmp_path, clean, value):
    """A recorder that died leaves 0 or 0xFFFFFFFF; everything behind it is there."""
    samples, stops = clean
    recording = read_recording(damaged(tmp_path / "a.wav", samples, "data", value))
    assert np.allclose(recording.stops_s, stops, atol=0.012)
    if value == 0:
        assert "header does not say" in words(recording)


def test_half_a_file_is_truncated_and_said_so(tmp_path, clean):
    path = write(tmp_path / "a.wav", clean[0], subtype="PCM_16")
    data = path.read_bytes()
    path.write_bytes(data[: int(0.62 * len(data))])
    recording = read_recording(path)
    assert "truncated" in words(recording)
    assert len(recording.stops_s) >= 1


@pytest.mark.parametrize(
    ("name", "content", "message"),
    [
        ("a.wav", b"", "empty"),
        ("a.wav", b"hello, I am no sound file at all" * 20, "no sound file"),
        ("a.wav", b"RIFF\x00\x00\x00\x00WAVEfmt ", "no sound file|holds no sound"),
        ("a.m4a", b"\x00\x00\x00\x20ftypM4A " + bytes(2000), "WAV or FLAC"),
        ("a.aac", bytes(4000), "WAV or FLAC"),
    ],
)
def test_what_is_no_recording_is_refused_in_words(tmp_path, name, content, message):
    path = tmp_path / name
    path.write_bytes(content)
    with pytest.raises(RecordingError, match=message) as refusal:
        read_recording(path)
    assert name in str(refusal.value)


def test_a_missing_file_and_a_folder(tmp_path):
    with pytest.raises(RecordingError, match="cannot be read"):
        read_recording(tmp_path / "none.wav")
    with pytest.raises(RecordingError, match="no sound files"):
        measure([tmp_path])
    with pytest.raises(RecordingError, match="does not exist"):
        measure([tmp_path / "none.wav"])


@pytest.mark.parametrize("value", [np.nan, np.inf])
def test_values_that_are_no_numbers(tmp_path, clean, value):
    samples = clean[0].copy()
    samples[50_000] = value
    with pytest.raises(RecordingError, match="no numbers"):
        read_recording(write(tmp_path / "a.wav", samples, subtype="FLOAT"))


def test_too_low_a_rate(tmp_path, clean):
    with pytest.raises(RecordingError, match="8000 Hz, 16000 Hz is the least"):
        read_recording(write(tmp_path / "a.wav", clean[0][::5], 8000))


def test_silence(tmp_path):
    with pytest.raises(RecordingError, match="only silence"):
        read_recording(write(tmp_path / "a.wav", np.zeros(5 * RATE)))


# Channels -----------------------------------------------------------------------------------------


def test_the_louder_clean_channel_is_used_and_said(tmp_path, clean):
    samples = clean[0]
    recording = read_recording(
        write(tmp_path / "a.wav", np.stack([0.2 * samples, samples], axis=1))
    )
    assert recording.channel == 2
    assert "Channel 2 of 2" in words(recording)
    assert "same signal" in words(recording)


def test_a_clipped_channel_is_passed_over(tmp_path, clean):
    samples = clean[0]
    both = np.stack([np.clip(8 * samples, -1, 1), samples], axis=1)
    assert read_recording(write(tmp_path / "a.wav", both)).channel == 2


@pytest.mark.parametrize(("second", "message"), [(0.0, "silent"), (-1.0, "inverted")])
def test_dead_and_inverted_channels_are_said(tmp_path, clean, second, message):
    samples = clean[0]
    recording = read_recording(
        write(tmp_path / "a.wav", np.stack([samples, second * samples], axis=1))
    )
    assert message in words(recording)
    assert len(recording.bursts) == 2


# Recorders that tamper ----------------------------------------------------------------------------


def envelope(samples, rate=RATE, seconds=0.005):
    """Short-time level, for recorders that react to it."""
    from scipy.ndimage import maximum_filter1d, uniform_filter1d

    return uniform_filter1d(
        maximum_filter1d(np.abs(samples), int(seconds * rate)), int(seconds * rate)
    )


def gain_control(samples, release_s, rate=RATE):
    """A gain that falls at once and recovers slowly, as in a phone."""
    block = 220
    level = envelope(samples, rate)[::block]
    gain, out = 1.0, np.empty(len(level))
    for n, value in enumerate(level):
        wanted = min(0.25 / max(value, 1e-4), 30.0)
        gain = (
            wanted
            if wanted < gain
            else gain + (wanted - gain) * (1 - np.exp(-block / rate / release_s))
        )
        out[n] = gain
    return samples * np.interp(np.arange(len(samples)), np.arange(len(level)) * block, out)


def tampered(kind, samples, stops):
    n, rate = len(samples), RATE
    t = np.arange(n) / rate
    rng = np.random.default_rng(9)
    noise = samples
    if kind == "gain control":
        return gain_control(noise, 0.6)
    if kind == "drift":
        return noise * 10 ** (-(t % 4.0) * 2.0 / 20)
    if kind == "clipping":
        return np.clip(6 * noise, -1, 1)
    if kind == "limiting":
        return np.clip(6 * noise, -1, 1) * 0.5
    if kind == "gate to zero":
        out = noise.copy()
        for stop in stops:
            out[int((stop + 0.25) * rate) : int((stop + 1.2) * rate)] = 0
        return out
    if kind == "gate drop":
        gain = np.ones(n)
        for stop in stops:
            gain[int((stop + 0.15) * rate) : int((stop + 1.3) * rate)] = 0.005
        return noise * gain
    if kind == "fade":
        on = pink(n, rate, rng)
        gain = np.zeros(n)
        start = 0.5
        for stop in stops:
            gain[(t >= start) & (t < stop)] = 1
            fading = (t >= stop) & (t < stop + 0.8)
            gain[fading] = 1 - (t[fading] - stop) / 0.8
            start = stop + 1.5
        from scipy.signal import fftconvolve

        return 0.1 * (
            fftconvolve(on * gain, response(0.3, rate, rng))[:n] + 0.003 * pink(n, rate, rng)
        )
    if kind == "high-pass":
        from scipy.signal import butter, sosfilt

        return sosfilt(butter(8, 300, "high", fs=rate, output="sos"), noise)
    if kind == "hum":
        tones = sum(np.sin(2 * np.pi * 50 * k * t) / k for k in (1, 2, 3))
        return noise + 0.01 * tones
    raise AssertionError(kind)


@pytest.mark.parametrize(
    ("kind", "message"),
    [
        ("gain control", "gain"),
        ("drift", "drifts"),
        ("clipping", "clipped"),
        ("limiting", "limited"),
        ("gate to zero", "digital silence"),
        ("gate drop", "drops by"),
        ("fade", "faded out"),
        ("high-pass", "under what pink noise would have"),
        ("hum", "mains hum of 50 Hz"),
    ],
)
def test_a_recorder_that_tampers_is_caught(tmp_path, clean, kind, message):
    """Each with its cure, and no plain figure from it: refused, or the spoilt bands flagged."""
    samples, stops = clean
    path = write(tmp_path / "A1.wav", tampered(kind, samples, stops), subtype="FLOAT")
    recording = read_recording(path)
    assert message in words(recording)
    assert any(finding.cure for finding in recording.findings)
    assert all(0.0 <= finding.start_s <= finding.stop_s for finding in recording.findings)
    said = " ".join(recording.warnings)
    assert all(said.count(finding.cure) == 1 for finding in recording.findings)
    if kind in ("high-pass", "hum"):
        spoilt = next(finding for finding in recording.findings if finding.bands_hz).bands_hz
        assert 63.0 in spoilt
        measured = measure([path]).measured
        for hz in spoilt:
            band = measured.bands_hz.index(hz)
            assert np.isnan(measured.t_s[band]) or measured.flags[band]
        return
    with pytest.raises(RecordingError, match="no decay can be used"):
        measure([path])


def test_very_dry_rooms_are_not_taken_for_fades(tmp_path):
    """T = 0.15 to 0.25 s falls by 10 dB in three or four frames: 48 bursts, none may be dropped."""
    for number in range(12):
        samples, stops = interrupted(
            time_s=(0.15, 0.2, 0.25)[number % 3],
            bursts=4,
            on_s=2.5 + 0.013 * number,
            seed=100 + number,
        )
        recording = read_recording(write(tmp_path / "a.wav", samples))
        assert len(recording.stops_s) == len(stops), words(recording)


@pytest.mark.parametrize("fade_s", [0.1, 0.3])
def test_short_fades_are_caught_in_a_dry_room(tmp_path, fade_s):
    """A straight ramp of the gain, as an editor or a soft mute makes it."""
    from scipy.signal import fftconvolve

    rate, rng = RATE, np.random.default_rng(5)
    t = np.arange(int(9 * rate)) / rate
    gain = np.interp(t % 4.5, [0, 0.5, 0.501, 3.0, 3.0 + fade_s, 4.5], [0, 0, 1, 1, 0, 0])
    heard = fftconvolve(pink(len(t), rate, rng) * gain, response(0.2, rate, rng))[: len(t)]
    heard = 0.1 * (heard + 0.003 * pink(len(t), rate, rng))
    recording = read_recording(write(tmp_path / "a.wav", heard))
    assert "faded out" in words(recording)
    assert not recording.stops_s


def test_recording_stopped_too_early(tmp_path, clean):
    samples, stops = clean
    cut = samples[: int((stops[0] + 0.15) * RATE)]
    with pytest.raises(RecordingError, match="Keep recording"):
        measure([write(tmp_path / "a.wav", cut)])


def test_too_little_steady_noise(tmp_path):
    samples, _ = interrupted(on_s=0.6, bursts=1, seed=4)
    with pytest.raises(RecordingError, match="Let the noise run longer"):
        measure([write(tmp_path / "a.wav", samples)])


def test_noise_that_never_stops(tmp_path):
    samples = 0.1 * pink(6 * RATE, RATE, np.random.default_rng(2))
    with pytest.raises(RecordingError, match="No switch-off is found"):
        measure([write(tmp_path / "a.wav", samples)])


def test_a_slammed_door_before_and_speech_after_do_not_move_the_stops(tmp_path, clean):
    samples, stops = clean
    rng = np.random.default_rng(8)
    spoilt = samples.copy()
    door = 0.3 * rng.standard_normal(2000) * np.exp(-np.arange(2000) / 400)
    spoilt[2000:4000] += door
    recording = read_recording(write(tmp_path / "a.wav", np.clip(spoilt, -1, 1)))
    assert np.allclose(recording.stops_s, stops, atol=0.012)


def test_too_loud_a_background_is_refused_in_decibels(tmp_path):
    samples, _ = interrupted(snr_db=17, seed=5)
    measured = measure([write(tmp_path / "a.wav", samples)]).measured
    low = [band for band, hz in enumerate(measured.bands_hz) if np.isnan(measured.t_s[band])]
    assert low
    assert all("dB" in measured.flags[band][0] for band in low)


def test_a_regular_signal_sharpens_its_switch_offs():
    """Found 8 ms early and late around a beat of 4 s: the mean of the others puts each right (by hand)."""
    found = [3.008, 7.000, 10.992, 15.000, 19.000]
    assert np.abs(np.array(regular(found)) - [3, 7, 11, 15, 19]).max() < 0.005
    assert regular([3.0, 7.0, 15.004]) == pytest.approx(
        [3.0, 7.0, 15.0], abs=0.004
    )  # one burst dropped
    assert regular([3.0, 7.1, 10.9]) == (3.0, 7.1, 10.9)  # switched by hand
    assert regular([3.0]) == (3.0,)
    assert regular([]) == ()


def test_a_damaged_mp3_gets_one_message(tmp_path, capfd):
    (tmp_path / "a.mp3").write_bytes(b"ID3\x03\x00" + bytes(2000))
    with pytest.raises(RecordingError, match="no sound file that can be read"):
        read_recording(tmp_path / "a.mp3")
    assert capfd.readouterr() == ("", "")
