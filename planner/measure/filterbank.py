"""Octave and one-third-octave filter bank: sound in, band energies out.

The band shape (see `filter_shape`) stands in closed form on the bins of overlapping FFT blocks,
so nothing is warped near the Nyquist frequency and every rate holds the same limits. Each band's
bins alone go through a short inverse FFT; the result is samples of the band's analytic signal z,
and |z|²/2, its squared pressure without ripple, is averaged over frames.

The response is conjugated by default: the filter then runs backwards in time, and what follows a
switch-off is never smeared by the noise before it. Memory does not depend on the length.

References
----------
.. [1] A. V. Oppenheim, R. W. Schafer, *Discrete-Time Signal Processing*: overlap-save.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from planner.measure.filter_shape import (
    ALL_OCTAVE_BANDS,
    OCTAVE_BANDS,
    THIRD_BANDS,
    Bands,
    band_response,
    check_bands,
    support,
)
from planner.measure.frames import FrameTotals

__all__ = [
    "ALL_OCTAVE_BANDS",
    "OCTAVE_BANDS",
    "THIRD_BANDS",
    "BandEnergies",
    "Bands",
    "Samples",
    "analytic_signals",
    "band_energies",
    "check_bands",
    "plan_bank",
    "section_energies",
]

Samples = NDArray[np.float32] | NDArray[np.float64]
"""Sound pressure of one channel, shape ``(sample,)``."""

BLOCK = {1: 2**18, 3: 2**19}
"""Samples of an FFT block, by bandwidth designator. [-]"""

BATCH = 4
"""Blocks that are transformed together: short vectors of a processor take them side by side."""

SAMPLED = {True: 4.0, False: 1.9}
"""Samples of a band's signal over its width: so dense that |z|² is nearly straight between them
where an array fits one block, or just so dense that its mean energy loses nothing. [-]"""

SETTLED = 8.0
"""A band rings down by more than 90 dB in this over its width. [-]"""


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
    """What the columns are."""
    reverse: bool = True
    """Whether the filters ran backwards in time."""

    @property
    def times(self) -> NDArray[np.float64]:
        """Middle of each frame, counted from `origin`, shape ``(frame,)``. [s]."""
        frames = np.arange(len(self.energy), dtype=np.float64)
        middles: NDArray[np.float64] = np.asarray(self.begin_s + (frames + 0.5) * self.frame_s)
        return middles


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
    """One per band."""


@lru_cache(maxsize=4)
def plan_bank(
    rate: float,
    bands: Bands,
    block: int,
    margin: int,
    reverse: bool,
    frame_s: float,
    dense: bool,
) -> BankPlan:
    """Lay out a filter bank.

    Parameters
    ----------
    rate, bands, reverse, frame_s
        As for `band_energies`.
    block, margin
        Length of a block and of its useless ends. [sample]
    dense
        Which of `SAMPLED`. A signal is sampled so often, and at least four times in a frame, but
        never more than twice as often as its bins fill.
    """
    plans = []
    step = rate / block
    for nominal, width in zip(bands.nominal, bands.width, strict=True):
        lowest, highest = support(nominal, fraction=bands.fraction)
        low = max(int(np.ceil(lowest / step)), 1)
        high = min(int(highest / step), block // 2) + 1
        response = band_response(
            np.arange(low, high) * step,
            nominal,
            fraction=bands.fraction,
            nyquist=rate / 2.0,
            reverse=reverse,
        )
        scaled = (response * (np.sqrt(2.0) / block)).astype(np.complex64)
        wanted = max(SAMPLED[dense] * width, 4.0 / frame_s) / step
        length = 1 << int(np.ceil(np.log2(min(wanted, 2.0 * (high - low)))))
        plans.append(BandPlan(low, scaled, length))
    return BankPlan(block, margin, tuple(plans))


def analytic_signals(
    blocks: NDArray[np.float32], plan: BankPlan
) -> Iterator[NDArray[np.complex64]]:
    """Per band, samples of z with |z|² the squared pressure; ``(block, sample)`` in and out."""
    from scipy.fft import ifft, rfft

    spectrum = rfft(blocks, axis=-1)
    for band in plan.bands:
        count, length = len(band.response), band.length
        rows = -(-count // length)
        # Sampling a signal more slowly lays its spectrum over itself.
        bins = np.zeros((len(blocks), rows * length), np.complex64)
        np.multiply(spectrum[:, band.low : band.low + count], band.response, out=bins[:, :count])
        if rows > 1:
            bins = bins.reshape(len(blocks), rows, length).sum(axis=1)
        yield ifft(bins, axis=-1, norm="forward", overwrite_x=True)


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
    margin = int(np.ceil(SETTLED * rate / float(np.min(bands.width))))
    block = _block_length(known, margin, bands)
    dense = known is not None and known + 2 * margin <= block
    plan = plan_bank(float(rate), bands, block, margin, reverse, frame_s, dense)
    length = frame_s * rate
    first = int(np.ceil(-origin / length - 1e-9))  # first frame that begins inside the source
    totals = FrameTotals(length, origin + first * length, len(bands))
    total = 0
    for begin, batch, total in _overlapping(blocks, plan):  # noqa: B007 - the last one is used
        kept = totals.cuts(begin, len(batch), block - 2 * margin)
        for column, signal in enumerate(analytic_signals(batch, plan)):
            totals.add(column, signal, kept, margin, block / signal.shape[1])
        totals.close(kept)
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
    margin = int(np.ceil(SETTLED * rate / float(np.min(bands.width))))
    first = max(start - margin, 0)
    samples = np.asarray(read(first, stop + margin))
    whole = band_energies(
        samples, rate, bands, frame_s=frame_s, origin=origin - first, reverse=reverse
    )
    length = frame_s * rate
    index = round(whole.begin_s / frame_s) + np.arange(len(whole.energy))
    begins = origin + index * length
    inside = (begins >= start - 1e-6) & (begins + length <= stop + 1e-6)
    begin = float(index[inside][0] * frame_s) if inside.any() else 0.0
    return BandEnergies(whole.energy[inside], frame_s, begin, bands, reverse)


def _block_length(known: int | None, margin: int, bands: Bands) -> int:
    """A power of two (times 9 or 3) that holds a short array whole, or the standard block."""
    standard = BLOCK[bands.fraction]
    while standard < 12 * margin:  # high rates and low bands: keep the margins a small part
        standard *= 2
    if known is None or known + 2 * margin > standard:
        return standard
    least = known + 2 * margin
    power = 1 << (max(least, 16) - 1).bit_length()
    return min(size for size in (power, power * 3 // 4, power * 9 // 16) if size >= least)


def _overlapping(
    blocks: Iterable[Samples], plan: BankPlan
) -> Iterator[tuple[int, NDArray[np.float32], int]]:
    """Batches of blocks with margins: source position of the first kept sample, samples so far.

    The memory of a batch, shape ``(block, sample)``, is used again for the next one.
    """
    size, margin = plan.block, plan.margin
    hop = size - 2 * margin
    batch = np.zeros((BATCH, size), np.float32)
    row, filled, begin, total = 0, margin, 0, 0
    for block in blocks:
        taken = 0
        while taken < len(block):
            count = min(size - filled, len(block) - taken)
            batch[row, filled : filled + count] = block[taken : taken + count]
            filled, taken, total = filled + count, taken + count, total + count
            if filled < size:
                continue
            if row + 1 == BATCH:
                yield begin, batch, total
                begin += BATCH * hop
            following = (row + 1) % BATCH
            batch[following, : 2 * margin] = batch[row, hop:]
            row, filled = following, 2 * margin
    while begin + row * hop < total:
        batch[row, filled:] = 0.0
        if row + 1 == BATCH or begin + (row + 1) * hop >= total:
            yield begin, batch[: row + 1], total
            begin += (row + 1) * hop
        following = (row + 1) % BATCH
        batch[following, : 2 * margin] = batch[row, hop:]
        row, filled = following if begin <= total else 0, 2 * margin
