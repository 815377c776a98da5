"""An hour-long recording with six bursts, against streaming the file once.

``pytest tests/benchmarks/test_recording.py -m benchmark --benchmark-enable -s`` prints the ratios.
"""

import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest
import soundfile

sys.path.insert(0, str(Path(__file__).parents[1] / "measure"))
from rooms import pink, response

RATE = 48_000
MINUTES = 60

pytestmark = pytest.mark.benchmark


def write_hour(path, minutes=MINUTES):
    """Background noise with a burst every ten minutes, 24 bit, written block by block."""
    from scipy.signal import fftconvolve

    rng = np.random.default_rng(1)
    burst = fftconvolve(
        np.concatenate([pink(3 * RATE, RATE, rng), np.zeros(2 * RATE)]), response(0.5, RATE, rng)
    )[: 5 * RATE]
    burst *= 0.1 / np.std(burst[RATE : 2 * RATE])
    quiet = 3e-4 * pink(60 * RATE, RATE, rng)
    stops = []
    with soundfile.SoundFile(path, "w", RATE, 1, "PCM_24") as file:
        for minute in range(minutes):
            block = quiet.copy()
            if minute % max(minutes // 6, 1) == 0:
                block[10 * RATE : 15 * RATE] += burst
                stops.append(60 * minute + 13.0)
            file.write(block)
    return stops


def stream(path):
    """What any program must do at least: read the file once and look at its level."""
    total = 0.0
    with soundfile.SoundFile(path) as file:
        for block in file.blocks(2**17, dtype="float32"):
            total += float(np.dot(block, block))
    return total


@pytest.fixture(scope="module")
def hour(tmp_path_factory):
    path = tmp_path_factory.mktemp("hour") / "hour.wav"
    return path, write_hour(path)


def test_an_hour_with_six_bursts(hour):
    from planner.measure.decay import evaluate_decays
    from planner.measure.recording import read_recording

    path, stops = hour
    found = read_recording(path)
    assert np.allclose(found.stops_s, stops, atol=0.012)
    one = next(b for b in evaluate_decays(found.bursts).each if b.band_hz == 1000)
    assert one.t_s == pytest.approx(0.5, rel=0.06)
    ours, theirs = [], []
    for _ in range(3):
        began = time.perf_counter()
        stream(path)
        theirs.append(time.perf_counter() - began)
        began = time.perf_counter()
        read_recording(path)
        ours.append(time.perf_counter() - began)
    print(f"\nan hour, six bursts: {min(ours) / min(theirs):.2f} × streaming it once (aim 1.5)")


def test_memory_does_not_grow_with_length(hour):
    """Peak resident memory above the import baseline, in a process of its own."""
    path, _ = hour
    code = (
        "import sys, scipy.fft, scipy.signal, soundfile, numpy\n"
        "from planner.measure.recording import read_recording\n"
        "def kib(name):\n"
        "    return int(next(l for l in open('/proc/self/status') if l.startswith(name)).split()[1])\n"
        "base = kib('VmRSS')\n"
        "read_recording(sys.argv[1])\n"
        "print((kib('VmHWM') - base) / 1024)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, str(path)], capture_output=True, text=True, check=True
    )
    peak = float(done.stdout)
    print(f"\nan hour of 48 kHz 24-bit mono: {peak:.0f} MB above the import baseline (limit 100)")
    assert peak < 100
