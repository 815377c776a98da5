"""The filter bank against what a user would otherwise run, on ten minutes of 48 kHz, 24 bit.

Run with ``pytest tests/benchmarks/test_filterbank.py -m benchmark -s``. Figures are ratios of
times in one run; peak memory is what a process of its own needs above its imports.
"""

import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np
import pytest
import soundfile

from planner.measure.filterbank import OCTAVE_BANDS, THIRD_BANDS, Bands, band_energies

pytestmark = pytest.mark.benchmark

RATE, SECONDS, FRAME = 48000, 600, 0.005


@pytest.fixture(scope="module")
def ten_minutes(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_noise(tmp_path_factory.mktemp("long") / "ten-minutes.wav", SECONDS)


def write_noise(path: Path, seconds: int) -> Path:
    rng = np.random.default_rng(1)
    with soundfile.SoundFile(path, "w", RATE, 1, "PCM_24") as file:
        for _ in range(seconds // 10):
            file.write(0.1 * rng.standard_normal(10 * RATE, np.float32))
    return path


def blocks(path: Path, size: int = 2**18) -> Iterator[np.ndarray]:
    with soundfile.SoundFile(path) as file:
        memory = np.empty(size, np.float32)
        while len(block := file.read(size, dtype="float32", out=memory)):
            yield block


def ours(path: Path, bands: Bands) -> np.ndarray:
    return band_energies(blocks(path), RATE, bands, frame_s=FRAME).energy


def read_and_one_fft(path: Path) -> None:
    """The least that any program does: the file in memory and its spectrum, single precision."""
    from scipy.fft import rfft

    rfft(soundfile.read(path, dtype="float32")[0])


def direct(path: Path, bands: Bands) -> np.ndarray:
    """Third-order Butterworth band-passes at the full rate, squared and averaged."""
    from scipy.signal import butter, sosfilt

    samples, _ = soundfile.read(path)
    length = int(FRAME * RATE)
    energy = []
    for low, high in zip(bands.exact / 10**0.15, bands.exact * 10**0.15, strict=True):
        sections = butter(3, (low, high), "bandpass", fs=RATE, output="sos")
        squared = sosfilt(sections, samples) ** 2
        energy.append(squared.reshape(-1, length).mean(axis=1))
    return np.array(energy).T


def with_pyfar(path: Path) -> np.ndarray:
    """The fractional-octave filters of pyfar, in its own default order, squared and averaged."""
    import pyfar

    signal = pyfar.Signal(soundfile.read(path)[0], RATE)
    filtered = pyfar.dsp.filter.fractional_octave_bands(signal, 1, frequency_range=(60, 8000))
    squared = np.square(filtered.time[:, 0], out=filtered.time[:, 0])
    return squared.reshape(len(squared), -1, int(FRAME * RATE)).mean(axis=2).T


def best(jobs: list[Callable[[], object]], rounds: int) -> list[float]:
    """Shortest time of each job [s]; they take turns, so that a busy machine slows all alike."""
    times = np.full((rounds, len(jobs)), np.inf)
    for turn in range(rounds):
        for index, job in enumerate(jobs):
            begin = time.perf_counter()
            job()
            times[turn, index] = time.perf_counter() - begin
    return list(times.min(axis=0))


def peak_mib(code: str, path: Path) -> float:
    """Peak resident memory of a fresh process above what it holds after its imports. [MiB].

    From the kernel's own high-water mark (Linux); NaN elsewhere.
    """
    if not Path("/proc/self/status").exists():
        return float("nan")
    program = (
        "import sys\n"
        "import numpy, soundfile, scipy.fft, scipy.signal, pathlib\n"
        "sys.path.insert(0, sys.argv[2])\n"
        "import test_filterbank as bench\n"
        "numpy.fft.rfft(numpy.zeros(64)); scipy.fft.rfft(numpy.zeros(64, 'f'))\n"
        "status = lambda: pathlib.Path('/proc/self/status').read_text()\n"
        "peak = lambda: int(status().split('VmHWM:')[1].split()[0]) / 1024\n"
        "before = peak(); path = pathlib.Path(sys.argv[1])\n"
        f"{code}\n"
        "print(peak() - before)"
    )
    folder = str(Path(__file__).parent)
    done = subprocess.run(
        [sys.executable, "-c", program, str(path), folder],
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    return float(done.stdout)


def test_octaves_and_thirds_against_the_alternatives(ten_minutes, capsys):
    """At least 3.5 times a direct bank, 15 times pyfar; 0.8 (thirds 1.1) of reading and one FFT."""
    got, expected = ours(ten_minutes, OCTAVE_BANDS), direct(ten_minutes, OCTAVE_BANDS)
    assert got.shape == expected.shape
    # equal results first: mean squares over the file, forward or backward alike; the bilinear
    # transform of the direct bank narrows its highest bands by some percent
    assert got.mean(axis=0)[:6] == pytest.approx(expected.mean(axis=0)[:6], rel=0.01)
    assert got.mean(axis=0)[6:] == pytest.approx(expected.mean(axis=0)[6:], rel=0.08)
    floor, octaves, thirds = best(
        [
            lambda: read_and_one_fft(ten_minutes),
            lambda: ours(ten_minutes, OCTAVE_BANDS),
            lambda: ours(ten_minutes, THIRD_BANDS),
        ],
        8,
    )
    (bank,) = best([lambda: direct(ten_minutes, OCTAVE_BANDS)], 3)
    (pyfar_bank,) = best([lambda: with_pyfar(ten_minutes)], 1)
    memory = {
        "octaves": peak_mib("bench.ours(path, bench.OCTAVE_BANDS)", ten_minutes),
        "thirds": peak_mib("bench.ours(path, bench.THIRD_BANDS)", ten_minutes),
        "direct bank": peak_mib("bench.direct(path, bench.OCTAVE_BANDS)", ten_minutes),
        "read and one FFT": peak_mib("bench.read_and_one_fft(path)", ten_minutes),
    }
    with capsys.disabled():
        print(f"\noctaves: {bank / octaves:.1f} times faster than a direct sosfilt bank")
        print(f"octaves: {pyfar_bank / octaves:.0f} times faster than pyfar")
        print(f"octaves: {octaves / floor:.2f} of reading the file and one FFT")
        print(f"thirds:  {thirds / floor:.2f} of reading the file and one FFT")
        for name, mib in memory.items():
            print(f"peak memory, {name}: {mib:.0f} MiB")
    assert bank / octaves > 3.5
    assert pyfar_bank / octaves > 15.0
    assert octaves / floor < 0.8
    assert thirds / floor < 1.1


def test_an_hour_needs_no_more_memory_than_a_minute(tmp_path, capsys):
    """Under 100 MiB above the imports, for an hour of 48 kHz, 24 bit."""
    minute = write_noise(tmp_path / "minute.wav", 60)
    hour = write_noise(tmp_path / "hour.wav", 3600)
    code = "bench.ours(path, bench.OCTAVE_BANDS)"
    short, long = peak_mib(code, minute), peak_mib(code, hour)
    with capsys.disabled():
        print(f"\npeak memory: {short:.0f} MiB for a minute, {long:.0f} MiB for an hour")
    if np.isfinite(long):
        assert long < 100.0
