"""From files to a room: positions, averages, real rooms, many processes, and hostile bytes."""

import json
import struct
import sys
from pathlib import Path

import numpy as np
import pytest
import soundfile
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.air import Air
from planner.errors import InputError, RecordingError
from planner.measure.measurement import measure

sys.path.insert(0, str(Path(__file__).parent))
from rooms import interrupted, pink, write

RATE = 44_100

# Reverberation times of the two real rooms by an independent library (pyfar 0.8.1 and pyrato 1.1.0, noise-compensated
# backward integration, forward and time-reversed filters), from the README beside the recordings. [s]
GALLERY_T20 = {
    250: (0.42, 0.45),
    500: (0.52, 0.52),
    1000: (0.59, 0.59),
    2000: (0.52, 0.52),
    4000: (0.47, 0.47),
    8000: (0.39, 0.39),
}
GALLERY_T30 = {
    250: (0.45, 0.50),
    500: (0.58, 0.59),
    1000: (0.58, 0.59),
    2000: (0.53, 0.53),
    4000: (0.49, 0.49),
    8000: (0.41, 0.41),
}
CLAP_T20 = {
    500: (0.86, 0.86),
    1000: (0.74, 0.74),
    2000: (0.65, 0.65),
    4000: (0.54, 0.54),
    8000: (0.46, 0.46),
}


def value(measured, name, hz):
    return float(getattr(measured, name)[measured.bands_hz.index(hz)])


def near(found, expected, share):
    """Within a share of the range that the two ways of filtering span."""
    low, high = expected
    return low * (1 - share) <= found <= high * (1 + share)


def test_a_real_room_by_its_impulse_response(recordings_dir):
    """Within 5 % from 500 Hz up and 10 % at 250 Hz of the independent library; the 125 Hz band is curved."""
    measured = measure([recordings_dir / "pyfar_gallery_room_ir.wav"], impulse=True).measured
    for hz, expected in GALLERY_T20.items():
        assert near(value(measured, "t20_s", hz), expected, 0.10 if hz == 250 else 0.05), hz
    for hz, expected in GALLERY_T30.items():
        assert near(value(measured, "t30_s", hz), expected, 0.10 if hz == 250 else 0.05), hz
    assert measured.flags[measured.bands_hz.index(125)]


def test_a_real_room_by_a_clap(recordings_dir):
    """As above; 125 and 250 Hz are too close to the noise and must be refused or flagged."""
    measured = measure([recordings_dir / "seminar_room_clap.wav"], impulse=True).measured
    for hz, expected in CLAP_T20.items():
        assert near(value(measured, "t20_s", hz), expected, 0.05), hz
    for hz in (63, 125, 250):
        assert np.isnan(value(measured, "t_s", hz)) or measured.flags[measured.bands_hz.index(hz)]


def test_pink_noise_through_a_real_response_gives_the_same_time(recordings_dir, tmp_path):
    """Its ensemble-mean decay is the backward-integrated response: both ways agree within their uncertainty."""
    from scipy.signal import fftconvolve

    response, rate = soundfile.read(recordings_dir / "pyfar_gallery_room_ir.wav")
    rng = np.random.default_rng(1)
    files = []
    for number in range(3):
        noise, gate = pink(16 * rate, rate, rng), np.zeros(16 * rate)
        for start in (0.5, 4.5, 8.5, 12.5):
            gate[int(start * rate) : int((start + 2) * rate)] = 1
        heard = fftconvolve(noise * gate, response)[: len(noise)]
        heard /= np.sqrt(np.mean(heard[rate : 2 * rate] ** 2))
        heard += 10 ** (-55 / 20) * pink(len(noise), rate, rng)
        files.append(
            write(tmp_path / f"A{number + 1}.wav", 0.3 * heard / np.abs(heard).max(), rate)
        )
    by_noise = measure(files).measured
    by_impulse = measure([recordings_dir / "pyfar_gallery_room_ir.wav"], impulse=True).measured
    for hz in (250, 500, 1000, 2000, 4000, 8000):
        t, u = value(by_noise, "t_s", hz), value(by_noise, "u_s", hz)
        low = min(value(by_impulse, "t20_s", hz), value(by_impulse, "t30_s", hz))
        high = max(value(by_impulse, "t20_s", hz), value(by_impulse, "t30_s", hz))
        assert low - 3 * u - 0.03 * low <= t <= high + 3 * u + 0.03 * high, hz


@pytest.fixture(scope="module")
def site(tmp_path_factory):
    """Six positions of a room of 0.6 s, two bursts each."""
    folder = tmp_path_factory.mktemp("site")
    for number in range(6):
        samples, _ = interrupted(time_s=0.6, seed=20 + number, direct=0.1)
        write(folder / f"{'AB'[number // 3]}{number % 3 + 1}.wav", samples)
    return folder


def test_a_room_is_the_mean_of_its_positions(site):
    """The true time is 0.6 s in every band; engineering method by ISO 3382-2 (six pairs, two decays each)."""
    seen = []
    result = measure(
        [site],
        air=Air(21, 45),
        state="empty",
        date="2026-05-04",
        progress=lambda n, of: seen.append((n, of)),
    )
    measured = result.measured
    assert measured.grade == "engineering"
    assert measured.positions == (6,) * 8
    assert measured.decays == (12,) * 8
    assert seen[-1] == (6, 6)
    assert len(result.positions) == 6
    for band, hz in enumerate(measured.bands_hz):
        tolerance = max(3 * measured.u_s[band], 0.02 * 0.6)
        assert measured.t_s[band] == pytest.approx(0.6, abs=tolerance), hz
    relative = measured.u_s / measured.t_s
    assert relative[0] > relative[4]
    assert relative[4] < 0.05
    json.dumps(measured.to_json(), allow_nan=False)
    assert "12 pairs" in " ".join(measured.warnings)


def test_one_third_octaves(site):
    measured = measure([site / "A1.wav"], thirds=True).measured
    assert len(measured.bands_hz) == 24
    assert value(measured, "t_s", 1000) == pytest.approx(0.6, rel=0.15)


def test_files_of_one_position_are_joined_whatever_their_gain(site, tmp_path):
    """Two files of the same pair, one recorded 20 dB lower: four decays, one position."""
    for name, gain in (("x.wav", 1.0), ("y.wav", 0.1)):
        samples, _ = interrupted(time_s=0.6, seed=ord(name[0]))
        write(tmp_path / name, gain * samples)
    (tmp_path / "survey.csv").write_text(
        "file,source_position,microphone_position\nx.wav,A,1\ny.wav,A,1\n"
    )
    measured = measure([tmp_path]).measured
    assert measured.positions == (1,) * 8
    assert measured.decays == (4,) * 8
    assert value(measured, "t_s", 1000) == pytest.approx(0.6, rel=0.08)


def test_processes_give_the_same_as_one(site):
    one, many = measure([site], jobs=1).measured, measure([site], jobs=2).measured
    assert np.array_equal(one.t_s, many.t_s)


@pytest.mark.slow
@pytest.mark.filterwarnings("ignore")
def test_a_cluster_gives_the_same_as_one(site):
    """Joblib's dask backend takes the same calls; two processes on this machine stand for a cluster."""
    from dask.distributed import Client, LocalCluster
    from joblib import parallel_config

    with (
        LocalCluster(
            n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None
        ) as cluster,
        Client(cluster),
        parallel_config(backend="dask"),
    ):
        many = measure([site], jobs=2).measured
    assert np.array_equal(measure([site], jobs=1).measured.t_s, many.t_s)


def test_names_that_clash_are_refused(site, tmp_path):
    write(tmp_path / "A1.wav", interrupted(seed=1)[0])
    with pytest.raises(RecordingError, match="named twice"):
        measure([site, tmp_path])


# Hostile bytes ------------------------------------------------------------------------------------


def small_wav(path):
    samples, _ = interrupted(
        time_s=0.2, bursts=1, on_s=1.3, rate=16_000, off_s=1.0, lead_s=0.2, seed=2
    )
    return write(path, samples, 16_000, "PCM_16").read_bytes()


def outcome(path):
    """A measurement whose every figure is plausible, or one refusal in words."""
    try:
        measured = measure([path]).measured
    except InputError as refusal:
        assert str(refusal)  # noqa: PT017 - either outcome is right
        return
    known = np.isfinite(measured.t_s)
    assert np.all((measured.t_s[known] > 0) & (measured.t_s[known] < 60))
    assert np.all(np.isfinite(measured.u_s[known]))


@pytest.mark.slow
@settings(max_examples=1500, deadline=None)
@given(data=st.data())
def test_damaged_headers_and_bytes_never_surprise(tmp_path_factory, data):
    folder = tmp_path_factory.getbasetemp()
    raw = bytearray(
        small_wav(folder / "fuzz-base.wav")
        if not (folder / "fuzz-base.wav").exists()
        else (folder / "fuzz-base.wav").read_bytes()
    )
    for _ in range(data.draw(st.integers(1, 4))):
        kind = data.draw(st.sampled_from(["byte", "field", "cut", "insert"]))
        if kind == "byte":
            at = data.draw(st.integers(0, 60) | st.integers(0, len(raw) - 1))
            raw[at % max(len(raw), 1)] = data.draw(st.integers(0, 255))
        elif kind == "field" and len(raw) > 44:
            at = data.draw(st.sampled_from([4, 16, 20, 22, 24, 28, 32, 34, 40]))
            raw[at : at + 4] = struct.pack("<I", data.draw(st.integers(0, 2**32 - 1)))
        elif kind == "cut":
            del raw[data.draw(st.integers(1, len(raw))) :]
        else:
            at = data.draw(st.integers(0, min(len(raw), 100)))
            raw[at:at] = data.draw(st.binary(max_size=40))
        if not raw:
            raw = bytearray(b"R")
    path = folder / "fuzz.wav"
    path.write_bytes(bytes(raw))
    outcome(path)


@pytest.mark.slow
@settings(max_examples=600, deadline=None)
@given(
    st.binary(max_size=3000),
    st.sampled_from(
        [b"", b"RIFF\xff\xff\xff\xffWAVE", b"fLaC", b"FORM", b"OggS", b"caff", b"riff"]
    ),
)
def test_any_bytes_are_refused_in_words(tmp_path_factory, content, magic):
    path = tmp_path_factory.getbasetemp() / "bytes.wav"
    path.write_bytes(magic + content)
    outcome(path)
