"""Octave and one-third-octave filters (IEC 61260-1:2014 class 1): sound in, band energies out.

A third-order Butterworth band shape stands in closed form on the bins of overlapping FFT blocks,
so nothing is warped near the Nyquist frequency and every rate holds the same limits. Each band's
bins alone go through a short inverse FFT; the result is the band's analytic signal z at a reduced
rate, and |z|²/2, its squared pressure without ripple, is averaged over frames.

The response is conjugated by default: the filter then runs backwards in time, and what follows a
switch-off is never smeared by the noise before it. Memory does not depend on the length.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.bands import OCTAVES, THIRDS, band_edges, bandwidth, exact_midband
from planner.errors import InputError

Samples = NDArray[np.float32] | NDArray[np.float64]
"""Sound pressure of one channel, shape ``(sample,)``."""

BLOCK = {1: 2**18, 3: 2**19}
"""Samples of an FFT block, by bandwidth designator. [-]"""

NYQUIST_ROOM = 0.95
"""Largest upper band edge that is offered, as a part of the Nyquist frequency. [-]"""

_TAPER_FROM, _TAPER_TO = 5.4, 7.0
"""The skirt is faded out between these detunings q: from 44 dB down to nothing (class 1 asks for
40.5 dB at q = 5.3), without the ringing of a hard cut. [-]"""


@dataclass(frozen=True, slots=True)
class Bands:
    """Which bands: nominal midbands and bandwidth designator (1: octaves, 3: one-third octaves)."""

    nominal: tuple[float, ...]
    """Nominal midband frequencies, ascending. [Hz]"""
    fraction: int = 1
    """1 for octaves, 3 for one-third octaves. [-]"""

    def __len__(self) -> int:
        return len(self.nominal)

    @property
    def exact(self) -> NDArray[np.float64]:
        """Exact midband frequencies, shape ``(band,)``. [Hz]."""
        return exact_midband(self.nominal, fraction=self.fraction)

    @property
    def width(self) -> NDArray[np.float64]:
        """Width between the band edges, shape ``(band,)``. [Hz]."""
        return bandwidth(self.nominal, fraction=self.fraction)

    @property
    def statistical_width(self) -> NDArray[np.float64]:
        """Independent complex samples of noise in the band a second, shape ``(band,)``. [1/s].

        (∫|H|²)²/∫|H|⁴ of the third-order Butterworth shape: 0.4 π times the width.
        """
        return 0.4 * np.pi * self.width

    def offered(self, rate: float) -> Bands:
        """The bands whose upper edge lies under 0.95 of the Nyquist frequency of `rate` [Hz]."""
        _, high = band_edges(self.nominal, fraction=self.fraction)
        fits = high <= NYQUIST_ROOM * rate / 2.0
        return Bands(
            tuple(f for f, fit in zip(self.nominal, fits, strict=True) if fit), self.fraction
        )


OCTAVE_BANDS = Bands(tuple(map(float, OCTAVES)), 1)
"""63 Hz to 8 kHz."""
ALL_OCTAVE_BANDS = Bands((31.5, *map(float, OCTAVES), 16000.0), 1)
"""With 31.5 Hz and 16 kHz."""
THIRD_BANDS = Bands(tuple(map(float, THIRDS)), 3)
"""50 Hz to 10 kHz."""


@dataclass(frozen=True, slots=True)
class BandEnergies:
    """Squared pressure per frame and band."""

    energy: NDArray[np.float64]
    """Mean squared pressure, shape ``(frame, band)``. [Pa² or full scale²]"""
    frame_s: float
    """Length of a frame. [s]"""
    begin_s: float
    """Beginning of the first frame, counted from `origin`. [s]"""
    bands: Bands
    reverse: bool = True
    """Whether the filters ran backwards in time."""

    @property
    def times(self) -> NDArray[np.float64]:
        """Middle of each frame, counted from `origin`, shape ``(frame,)``. [s]."""
        frames = np.arange(len(self.energy), dtype=np.float64)
        middles: NDArray[np.float64] = np.asarray(self.begin_s + (frames + 0.5) * self.frame_s)
        return middles


def detuning(frequency: ArrayLike, nominal: float, *, fraction: int = 1) -> NDArray[np.float64]:
    """Distance from the midband, q = (f/f_m − f_m/f)/((f_2 − f_1)/f_m); ±1 at the edges. [-]."""
    middle = float(exact_midband(nominal, fraction=fraction))
    relative = float(bandwidth(nominal, fraction=fraction)) / middle
    ratio = np.asarray(frequency, float) / middle
    q: NDArray[np.float64] = (ratio - 1.0 / ratio) / relative
    return q


def band_response(
    frequency: ArrayLike,
    nominal: float,
    *,
    fraction: int = 1,
    nyquist: float = np.inf,
    reverse: bool = True,
) -> NDArray[np.complex128]:
    """Complex response of one band filter.

    Parameters
    ----------
    frequency
        Above 0, any shape. [Hz]
    nominal
        Nominal midband frequency. [Hz]
    fraction
        1 for octaves, 3 for one-third octaves.
    nyquist
        Half the sampling rate; the response fades out above the band edge before it. [Hz]
    reverse
        Time-reversed (default) or forward.

    Returns
    -------
    response
        H = 1/((1 + jq)(1 − q² + jq)), faded out where it is 44 dB down. [-]

    References
    ----------
    .. [1] S. Butterworth, "On the theory of filter amplifiers", Experimental Wireless 7 (1930).
    .. [2] IEC 61260-1:2014, 5.10: limits on relative attenuation.
    """
    f = np.asarray(frequency, float)
    q = detuning(f, nominal, fraction=fraction)
    response = np.asarray(1.0 / ((1.0 + 1j * q) * (1.0 - q**2 + 1j * q)), np.complex128)
    response *= _fade(np.abs(q), _TAPER_FROM, _TAPER_TO)
    if np.isfinite(nyquist):
        edge = float(band_edges(nominal, fraction=fraction)[1])
        response *= _fade(f, max(edge, 0.9 * nyquist), nyquist)
    return response.conj() if reverse else response


def _fade(x: NDArray[np.float64], start: float, end: float) -> NDArray[np.float64]:
    """1 up to `start`, half a cosine down to 0 at `end`."""
    faded: NDArray[np.float64] = np.cos(
        0.5 * np.pi * np.clip((x - start) / (end - start), 0.0, 1.0)
    )
    return faded * (x < end)


@dataclass(frozen=True, slots=True)
class BandPlan:
    """One band of a block: which bins, times what, through how short an inverse FFT."""

    low: int
    """First bin that is not zero."""
    response: NDArray[np.complex64]
    """Response on the bins from `low` on, scaled so that |z|² is the squared pressure."""
    length: int
    """Samples of the band's analytic signal in a block."""


@dataclass(frozen=True, slots=True)
class BankPlan:
    """A filter bank laid out for one block length."""

    block: int
    """Samples of a block."""
    margin: int
    """Samples at both ends of a block that are of no use."""
    bands: tuple[BandPlan, ...]


@cache
def plan_bank(rate: float, bands: Bands, block: int, margin: int, reverse: bool) -> BankPlan:
    """Lay out a filter bank: `rate` [Hz], `block` and `margin` [sample], see `band_energies`."""
    frequency = np.arange(block // 2 + 1) * (rate / block)
    plans = []
    for nominal in bands.nominal:
        response = np.zeros(len(frequency), complex)
        response[1:] = band_response(
            frequency[1:],
            nominal,
            fraction=bands.fraction,
            nyquist=rate / 2.0,
            reverse=reverse,
        )
        used = np.flatnonzero(response)
        low, high = int(used[0]), int(used[-1]) + 1
        scaled = (response[low:high] * (np.sqrt(2.0) / block)).astype(np.complex64)
        # Twice the bins resolve |z|² fully; it costs too much only in the top bands, whose frames
        # hold many samples anyway.
        bins = (high - low) * (2 if 8 * (high - low) <= block else 1)
        plans.append(BandPlan(low, scaled, _fast_length(bins)))
    return BankPlan(block, margin, tuple(plans))


def _fast_length(least: int) -> int:
    """Smallest 2^a·3^b (b ≤ 2) not below `least`: lengths that a short FFT likes."""
    exponent = int(least - 1).bit_length()
    sizes: list[int] = [2**exponent, 9 * 2 ** max(exponent - 3, 0), 9 * 2 ** max(exponent - 4, 0)]
    sizes += [3 * 2 ** max(exponent - 2, 0)]
    return min(size for size in sizes if size >= least)


def _margin(rate: float, bands: Bands) -> int:
    """Samples dropped at both ends of a block: the filter has rung down by more than 90 dB."""
    return int(np.ceil(8.0 * rate / float(np.min(bands.width))))


def analytic_signals(
    samples: Samples, plan: BankPlan
) -> Iterator[tuple[NDArray[np.complex64], float]]:
    """Per band of a full block, z scaled so that |z|² is the squared pressure; samples a step."""
    from scipy.fft import ifft, rfft

    spectrum = rfft(np.asarray(samples, np.float32))
    for band in plan.bands:
        bins = np.zeros(band.length, np.complex64)
        count = len(band.response)
        np.multiply(spectrum[band.low : band.low + count], band.response, out=bins[:count])
        yield ifft(bins, norm="forward", overwrite_x=True), plan.block / band.length


def band_energies(
    source: Samples | Iterable[Samples],
    rate: float,
    bands: Bands = OCTAVE_BANDS,
    *,
    frame_s: float = 0.005,
    origin: int = 0,
    reverse: bool = True,
) -> BandEnergies:
    """Squared pressure of each band, averaged over frames; reads a source once, in blocks.

    Parameters
    ----------
    source
        One channel as an array, or an iterable of arrays that follow each other (a file reader).
    rate
        Sampling rate. [Hz]
    bands
        Every one must be offered at this rate, see `Bands.offered`.
    frame_s
        Length of a frame. [s]
    origin
        Sample (from the start of `source`, may be outside it) at which a frame begins exactly, as
        a switch-off; times count from it.
    reverse
        Time-reversed filters (default), true down to B·T = 4, or forward ones.

    Returns
    -------
    energies
        Whole frames only, shape ``(frame, band)``. Outside the source there is silence.

    Raises
    ------
    InputError
        If a band does not fit under the Nyquist frequency.
    """
    check_bands(bands, rate)
    blocks = [source] if isinstance(source, np.ndarray) else source
    known = len(source) if isinstance(source, np.ndarray) else None
    margin = _margin(rate, bands)
    plan = plan_bank(float(rate), bands, _block_length(known, margin, bands), margin, reverse)
    length = frame_s * rate
    first = int(np.ceil(-origin / length - 1e-9))  # first frame that begins inside the source
    totals = _FrameTotals(length, origin + first * length, len(bands))
    total = 0
    for begin, block, total in _overlapping(blocks, plan):  # noqa: B007 - the last one is used
        totals.add(begin, block, plan)
    energy = totals.whole_frames(total)
    return BandEnergies(energy, frame_s, first * frame_s, bands, reverse)


def section_energies(
    read: Callable[[int, int], Samples],
    rate: float,
    start: int,
    stop: int,
    bands: Bands = OCTAVE_BANDS,
    *,
    frame_s: float = 0.001,
    origin: int | None = None,
    reverse: bool = True,
) -> BandEnergies:
    """Band energies of the samples [start, stop) of a long source.

    Parameters
    ----------
    read
        ``read(first, last)`` gives the samples [first, last) of one channel; it is asked for a
        margin on both sides (never below sample 0), and may return fewer at the end of the file.
    start, stop
        The section. [sample]
    origin
        Sample of the source at which a frame begins exactly and from which times count; `start`
        when not given.
    rate, bands, frame_s, reverse
        As for `band_energies`.

    Returns
    -------
    energies
        Whole frames that lie in [start, stop).
    """
    check_bands(bands, rate)
    origin = start if origin is None else origin
    margin = _margin(rate, bands)
    first = max(start - margin, 0)
    samples = np.asarray(read(first, stop + margin))
    whole = band_energies(
        samples, rate, bands, frame_s=frame_s, origin=origin - first, reverse=reverse
    )
    length = frame_s * rate
    begins = origin - first + (whole.begin_s / frame_s + np.arange(len(whole.energy))) * length
    inside = (begins >= start - first - 1e-6) & (begins + length <= stop - first + 1e-6)
    kept = np.flatnonzero(inside)
    begin = float(whole.begin_s + kept[0] * frame_s) if len(kept) else 0.0
    return BandEnergies(whole.energy[inside], frame_s, begin, bands, reverse)


def check_bands(bands: Bands, rate: float) -> None:
    """Refuse bands that a sampling rate [Hz] cannot carry."""
    missing = [f for f in bands.nominal if f not in bands.offered(rate).nominal]
    if missing:
        raise InputError(
            f"the {missing[0]:g} Hz band reaches above the {rate / 2:g} Hz that a rate of "
            f"{rate:g} Hz can carry",
            cure="Record at a higher sampling rate or leave the band out.",
        )
    if not len(bands):
        raise InputError("no band to evaluate", cure=f"At {rate:g} Hz choose lower bands.")


def _block_length(known: int | None, margin: int, bands: Bands) -> int:
    standard = BLOCK[bands.fraction]
    while standard < 8 * margin:  # high rates and low bands: keep the margins a small part
        standard *= 2
    if known is None:
        return standard
    return min(standard, 2 * _fast_length((known + 2 * margin + 1) // 2))


def _overlapping(
    blocks: Iterable[Samples], plan: BankPlan
) -> Iterator[tuple[int, NDArray[np.float32], int]]:
    """Full blocks with margins: source position of the first kept sample, block, samples so far.

    The block buffer is used again for the next one.
    """
    size, margin = plan.block, plan.margin
    hop = size - 2 * margin
    buffer = np.zeros(size, np.float32)
    filled, begin, total = margin, 0, 0
    for block in blocks:
        taken = 0
        while taken < len(block):
            count = min(size - filled, len(block) - taken)
            buffer[filled : filled + count] = block[taken : taken + count]
            filled, taken = filled + count, taken + count
            if filled == size:
                yield begin, buffer, total + taken
                buffer[: 2 * margin] = buffer[hop:].copy()
                filled, begin = 2 * margin, begin + hop
        total += len(block)
    while begin < total:
        buffer[filled:] = 0.0
        yield begin, buffer, total
        buffer[: 2 * margin] = buffer[hop:].copy()
        filled, begin = 2 * margin, begin + hop


class _FrameTotals:
    """Sums squared pressure into frames whose edges need not fall on samples."""

    def __init__(self, length: float, first: float, bands: int) -> None:
        self.length, self.first, self.bands = length, first, bands
        self.done: list[NDArray[np.float64]] = []
        self.carry = np.zeros(bands)
        self.frame = 0  # frames completed

    def add(self, begin: int, block: NDArray[np.float32], plan: BankPlan) -> None:
        """Take the kept part of a block that starts at source sample `begin`."""
        end = begin + plan.block - 2 * plan.margin
        if end <= self.first:
            return
        last = int(np.floor((end - self.first) / self.length))
        edges = self.first + np.arange(self.frame + 1, last + 1) * self.length
        cuts = np.concatenate([[max(float(begin), self.first)], edges, [float(end)]])
        pieces = np.empty((len(cuts) - 1, self.bands))
        for column, (signal, step) in enumerate(analytic_signals(block, plan)):
            power = signal.real**2 + signal.imag**2
            pieces[:, column] = _integrals(power, (cuts - begin + plan.margin) / step) * step
        pieces[0] += self.carry
        self.carry = pieces[-1]
        self.done.append(pieces[:-1] / self.length)
        self.frame = last

    def whole_frames(self, total: int) -> NDArray[np.float64]:
        """Mean squared pressure of the frames that end within `total` samples."""
        count = int(np.floor((total - self.first) / self.length + 1e-9))
        if count <= 0 or not self.done:
            return np.zeros((0, self.bands))
        return np.concatenate(self.done)[:count]


def _integrals(power: NDArray[np.float32], cuts: NDArray[np.float64]) -> NDArray[np.float64]:
    """Integrals of `power`, straight between its samples, from each position to the next."""
    base, end = int(cuts[0]), int(cuts[-1]) + 2
    part = power[base:end]
    running = np.zeros(len(part))
    np.cumsum(part[:-1], dtype=float, out=running[1:])
    at = cuts.astype(int) - base
    beyond = cuts - base - at
    here, following = part[at].astype(float), part[at + 1]
    # Trapezium sum up to sample `at`, then a part of the next trapezium.
    values = running[at] + 0.5 * (here - part[0])
    values += beyond * (here + 0.5 * beyond * (following - here))
    integrals: NDArray[np.float64] = np.maximum(np.diff(values), 0.0)
    return integrals
