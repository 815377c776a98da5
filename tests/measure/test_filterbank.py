"""The filter bank against IEC 61260-1:2014, and its frames against plain sums."""

import csv
from pathlib import Path

import numpy as np
import pytest

from planner.bands import OCTAVE_RATIO
from planner.errors import InputError
from planner.measure.filter_shape import decay_widening
from planner.measure.filterbank import (
    ALL_OCTAVE_BANDS,
    OCTAVE_BANDS,
    THIRD_BANDS,
    Bands,
    analytic_signals,
    band_energies,
    plan_bank,
    section_energies,
)

LIMITS = Path(__file__).parents[1] / "reference" / "octave_filter_limits.csv"
RATES = (16000, 44100, 48000, 96000, 192000)
KINDS = {1: "octave", 3: "one-third octave"}


def class_one(fraction: int) -> list[tuple[float, float, float]]:
    """Breakpoints of class 1 above the midband: Ω, least and largest relative attenuation.

    IEC 61260-1:2014, Table 1 and Formula (9); source per row in the file.
    """
    with LIMITS.open() as file:
        return [
            (float(r["Omega_high"]), float(r["min_rel_atten_dB"]), float(r["max_rel_atten_dB"]))
            for r in csv.DictReader(file)
            if r["edition"] == "IEC 61260-1:2014"
            and r["bandwidth"] == KINDS[fraction]
            and r["class"] == "1"
        ]


def limits_at(omega, fraction):
    """Limits at normalised frequencies: linear in lg Ω between breakpoints (Formula 11)."""
    omega = np.maximum(omega, 1.0 / omega)
    rows = class_one(fraction)
    inside = [row for row in rows if np.isfinite(row[2])]
    outside = [row for row in rows if not np.isfinite(row[2])]
    x = np.log(omega)
    edge = np.log(inside[-1][0])
    least = np.where(
        x < edge,
        np.interp(x, np.log([r[0] for r in inside]), [r[1] for r in inside]),
        np.interp(x, np.log([r[0] for r in outside]), [r[1] for r in outside]),
    )
    most = np.interp(x, np.log([r[0] for r in inside]), [r[2] for r in inside])
    # At the very edge the tabulated values of both regions hold; either side of it one of them.
    return least, np.where(x <= edge, most, np.inf)


def attenuation(rate, bands, reverse=True, block=2**19):
    """Attenuation [dB] of every band on a dense grid: impulses in, the bank's output analysed.

    The bank hands out a band's signal at a reduced rate, its bins counted from the lowest one on.
    Where that rate is less than the bins fill, impulses at every place between two samples
    together show the signal at the full rate, and the response follows without doubt.
    """
    plan = plan_bank(float(rate), bands, block, 0, reverse, 0.001, False)
    frequency = np.arange(block // 2 + 1) * (rate / block)
    steps = [block // band.length for band in plan.bands]
    folded = [len(band.response) > band.length for band in plan.bands]
    spectra = [np.zeros(block, complex) for _ in plan.bands]
    full = [np.zeros(block, complex) for _ in plan.bands]
    for shift in range(max([1] + [s for s, f in zip(steps, folded, strict=True) if f])):
        impulse = np.zeros((1, block), np.float32)
        impulse[0, shift] = 1.0
        for index, (signal,) in enumerate(analytic_signals(impulse, plan)):
            length, step, low = len(signal), steps[index], plan.bands[index].low
            if shift == 0 and not folded[index]:
                spectra[index][low : low + length] = np.fft.fft(signal.astype(complex)) / length
            elif folded[index] and shift < step:
                place = np.arange(length) * step
                carrier = np.exp(2j * np.pi * (low * place % block) / block)
                full[index][(place - shift) % block] = signal * carrier
    for index, spectrum in enumerate(spectra):
        if folded[index]:
            spectrum = np.fft.fft(full[index]) / block
        with np.errstate(divide="ignore"):
            # |z|² of a sine of amplitude √2 is its squared pressure, 1
            response = np.abs(spectrum[: block // 2 + 1]) * block / np.sqrt(2.0)
            yield frequency, -20.0 * np.log10(response)


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize("bands", [ALL_OCTAVE_BANDS, THIRD_BANDS], ids=["octaves", "thirds"])
def test_every_band_holds_class_1_at_every_rate(rate, bands):
    """IEC 61260-1:2014, Table 1, on every FFT bin from 1 Hz (0.03-0.4 Hz apart) to Nyquist."""
    offered = bands.offered(rate)
    for middle, (frequency, lost) in zip(offered.exact, attenuation(rate, offered), strict=True):
        usable = frequency >= 1.0
        omega = frequency[usable] / middle
        least, most = limits_at(omega, bands.fraction)
        # float32 leaves noise 120 dB down; the limits end at 70 dB
        assert np.all(lost[usable] >= least), middle
        assert np.all(lost[usable] <= most), middle


@pytest.mark.parametrize("bands", [OCTAVE_BANDS, THIRD_BANDS], ids=["octaves", "thirds"])
def test_sines_at_the_breakpoints_come_out_within_the_limits(bands):
    """The same table through the whole path: sines in, mean squared pressure per frame out."""
    rate, seconds = 48000, 2.0
    middle = bands.exact[9 if bands.fraction == 3 else 3]
    rows = class_one(bands.fraction)
    ratios = sorted({row[0] for row in rows} | {1.0 / row[0] for row in rows})
    length = int(rate * seconds)
    phase = 2.0 * np.pi * np.arange(length) / rate
    signal = np.concatenate([np.sqrt(2.0) * np.sin(phase * middle * r) for r in ratios])
    one = Bands((bands.nominal[9 if bands.fraction == 3 else 3],), bands.fraction)
    energy = band_energies(signal, rate, one, frame_s=0.5).energy[:, 0]
    for index, ratio in enumerate(ratios):
        lost = -10.0 * np.log10(energy[4 * index + 1 : 4 * index + 3].mean() + 1e-30)
        inside = [r for r in rows if np.isfinite(r[2]) and np.isclose(max(ratio, 1 / ratio), r[0])]
        outside = [r for r in rows if np.isinf(r[2]) and max(ratio, 1 / ratio) >= r[0] - 1e-9]
        least = min(r[1] for r in inside) if inside else max(r[1] for r in outside)
        most = max((r[2] for r in inside), default=np.inf)
        assert least <= lost <= most, (ratio, lost)


@pytest.mark.parametrize(
    ("rate", "highest", "highest_third"),
    [(16000, 4000, 6300), (44100, 8000, 10000), (48000, 16000, 10000), (192000, 16000, 10000)],
)
def test_a_band_is_offered_only_where_its_upper_edge_fits(rate, highest, highest_third):
    """Upper edges f_m·G^(1/2b): 22387 Hz for 16 kHz, 5623 Hz for 4 kHz, 7079 Hz for 6.3 kHz."""
    assert ALL_OCTAVE_BANDS.offered(rate).nominal[-1] == highest
    assert THIRD_BANDS.offered(rate).nominal[-1] == highest_third


def test_a_band_above_nyquist_is_refused_in_words():
    with pytest.raises(InputError, match="8000 Hz band reaches above the 8000 Hz"):
        band_energies(np.zeros(1000, np.float32), 16000, OCTAVE_BANDS)


def test_a_file_read_in_odd_blocks_gives_the_same_as_one_array():
    rng = np.random.default_rng(1)
    signal = rng.standard_normal(8 * 48000).astype(np.float32)
    pieces = (signal[i : i + 7001] for i in range(0, len(signal), 7001))
    whole = band_energies(signal, 48000, origin=12345)
    parts = band_energies(pieces, 48000, origin=12345)
    assert whole.begin_s == parts.begin_s
    # long files are sampled just densely enough for their energy: over 0.1 s nothing is left of it
    coarse = [
        e.energy[: len(e.energy) // 20 * 20].reshape(-1, 20, 8).mean(1) for e in (whole, parts)
    ]
    assert coarse[1] == pytest.approx(coarse[0], rel=0.03)
    assert parts.energy.mean(axis=0) == pytest.approx(whole.energy.mean(axis=0), rel=1e-3)


@pytest.mark.parametrize("nominal", [125.0, 1000.0, 8000.0])
def test_frames_hold_the_mean_square_of_an_independent_filter(nominal):
    """A Butterworth band-pass of scipy, run backwards, sees the same energy in every frame."""
    from scipy.signal import butter, sosfilt

    rate, origin, frame = 192000, 5003, 0.05
    rng = np.random.default_rng(2)
    signal = rng.standard_normal(rate)
    middle = 1000.0 * OCTAVE_RATIO ** np.round(np.log(nominal / 1000) / np.log(OCTAVE_RATIO))
    edges = middle * OCTAVE_RATIO ** np.array([-0.5, 0.5])
    sections = butter(3, edges, "bandpass", fs=rate, output="sos")
    filtered = sosfilt(sections, signal[::-1])[::-1]
    got = band_energies(signal, rate, Bands((nominal,)), frame_s=frame, origin=origin)
    length = int(frame * rate)
    first = origin + round(got.begin_s / frame) * length
    assert 0 <= first < length
    squares = filtered[first : first + len(got.energy) * length].reshape(-1, length) ** 2
    # the ripple of a square at twice the frequency is all that a mean over 50 ms leaves
    expected = squares.mean(axis=1)
    np.testing.assert_allclose(got.energy[:, 0], expected, atol=0.06 * expected.mean())
    assert got.energy.sum() == pytest.approx(squares.mean(axis=1).sum(), rel=2e-3)


def test_time_reversed_filters_keep_the_decay_clear_of_the_noise_before():
    """After a stop nothing is left but what the skirt cut gives: forward filters ring on."""
    rate, stop = 48000, 48000
    signal = np.random.default_rng(3).standard_normal(2 * rate)
    signal[stop:] = 0.0
    band = Bands((125.0,))
    levels = {}
    for reverse in (True, False):
        energies = band_energies(signal, rate, band, frame_s=0.01, origin=stop, reverse=reverse)
        after = (energies.times > 0.006) & (energies.times < 0.02)
        before = energies.times < -0.2
        ratio = energies.energy[after].mean() / energies.energy[before].mean()
        levels[reverse] = 10.0 * np.log10(ratio)
    assert levels[True] < -57.0  # the skirt, faded out from 44 dB on
    assert levels[False] > -25.0


def test_a_section_equals_the_same_place_of_a_longer_array():
    rng = np.random.default_rng(4)
    rate = 44100
    signal = rng.standard_normal(5 * rate)
    origin = 3 * rate + 17
    whole = band_energies(signal, rate, frame_s=0.005, origin=origin)
    section = section_energies(
        lambda a, b: signal[a:b], rate, 2 * rate, 4 * rate, frame_s=0.005, origin=origin
    )
    first = round((section.begin_s - whole.begin_s) / 0.005)
    assert section.begin_s == pytest.approx(-1.0)
    assert len(section.energy) == 399  # whole frames between 2 s and 4 s, from 17 samples on
    expected = whole.energy[first : first + len(section.energy)]
    np.testing.assert_allclose(section.energy, expected, atol=0.02 * expected.mean(axis=0).max())


def test_noise_bandwidth_is_that_of_the_shape():
    """∫|H|² of a third-order Butterworth shape is π/3 times its width (textbook integral)."""
    rate = 48000
    signal = np.random.default_rng(5).standard_normal(40 * rate)
    energy = band_energies(signal, rate).energy[200:-200].mean(axis=0)
    expected = OCTAVE_BANDS.width * (np.pi / 3.0) / (rate / 2.0)
    # standard error of the 63 Hz band: 1/sqrt(56 Hz · 38 s) = 2.2 %
    assert energy == pytest.approx(expected, rel=0.06)
    assert energy[4:7] == pytest.approx(expected[4:7], rel=0.02)


def test_silence_and_short_input_give_no_surprise():
    quiet = band_energies(np.zeros(48000, np.float32), 48000)
    assert quiet.energy.shape == (200, 8)
    assert np.all(quiet.energy == 0.0)
    assert band_energies(np.zeros(3, np.float32), 48000).energy.shape == (0, 8)
    assert band_energies(iter(()), 48000).energy.shape == (0, 8)


def test_statistical_widths_are_the_integrals_of_the_shape():
    """(∫|H|²)²/∫|H|⁴ of 1/((1+s)(1+s+s²)), s = jω for steady noise, jω + δ for a decay.

    Numerically here; the definition is that of Bendat and Piersol, *Random Data*, section 8.3.
    """
    omega = np.linspace(-300.0, 300.0, 300001)  # over half the bandwidth, π·B

    def width(delta):
        s = 1j * omega + delta
        power = np.abs(1.0 / ((1.0 + s) * (1.0 + s + s**2))) ** 2
        return 0.5 * (omega[1] - omega[0]) * power.sum() ** 2 / (power**2).sum()

    assert OCTAVE_BANDS.statistical_width / OCTAVE_BANDS.width == pytest.approx(width(0.0), 1e-3)
    for resolved in (3.5, 5.0, 10.0, 50.0):
        delta = 3.0 * np.log(10.0) / (np.pi * resolved)  # e^(−2δt) falls by 60 dB in T
        expected = width(delta) / width(0.0)
        assert decay_widening(resolved) == pytest.approx(expected, rel=5e-3)
