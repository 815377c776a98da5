"""Whole-decay fits of all bands of a position, and whether what they leave is noise."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.measure.filterbank import BandEnergies
from planner.measure.lines import grouped
from planner.measure.whole_decay import WholeDecay, fit_whole_decay

Array = NDArray[np.float64]

GUARD_S = 0.003
"""Skipped after the switch-off, whose place is known to 2 ms. [s]"""

SETTLE = 5.0
"""A filter has rung down by 60 dB after this over its width. [-]"""

REGULAR_DEGREES = 4.0
"""Independent complex samples in a frame when the scatter about a fit is judged. [-]"""

MATTERS = 0.12
"""Scatter about a fit beyond that of noise, relative, that is worth a flag: half a decibel. [-]"""

HOPELESS = 0.8
"""Scatter about a fit beyond that of noise, relative, above which no figure is given. [-]"""


@dataclass(frozen=True, slots=True)
class Fits:
    """The whole-decay fits of one band, and the frames they used."""

    time: Array
    energy: Array
    one: WholeDecay
    two: WholeDecay


def fit_bands(mean: BandEnergies, count: int) -> dict[int, Fits]:
    """Whole-decay fits; bands that need the same frames are fitted in one go."""
    windows = defaultdict(list)
    for band, width in enumerate(mean.bands.width):
        last = mean.times[-1] - SETTLE / width
        inside = np.flatnonzero((mean.times > GUARD_S) & (mean.times < last))
        if len(inside) >= 40 and np.count_nonzero(mean.energy[inside, band]) >= 40:
            windows[(int(inside[0]), int(inside[-1]) + 1)].append(band)
    fits: dict[int, Fits] = {}
    for (first, last), members in windows.items():
        fits |= _fit_window(mean, count, slice(first, last), np.array(members))
    return fits


def _fit_window(
    mean: BandEnergies, count: int, window: slice, members: NDArray[np.intp]
) -> dict[int, Fits]:
    time, energy = mean.times[window], mean.energy[window][:, members]
    degrees = count * mean.bands.statistical_width[members] * mean.frame_s
    coarse = max(len(time) // 300, 1)
    rough = fit_whole_decay(grouped(energy, coarse), grouped(time, coarse), degrees * coarse)
    wanted = rough.time_s[0] / 40.0 / mean.frame_s
    sizes = np.clip(wanted, 1, max(len(time) // 40, 1)).astype(int)
    ends = np.minimum(_enough(rough, float(time[-1])) / mean.frame_s, len(time)).astype(int)
    fits = {}
    for size, end in set(zip(sizes.tolist(), ends.tolist(), strict=True)):
        chosen = np.flatnonzero((sizes == size) & (ends == end))
        at, part = grouped(time[:end], size), grouped(energy[:end, chosen], size)
        one = fit_whole_decay(part, at, degrees[chosen] * size)
        two = fit_whole_decay(part, at, degrees[chosen] * size, slopes=2, single=one)
        for place, index in enumerate(chosen):
            fits[int(members[index])] = Fits(
                time[:end], energy[:end, index], one.decay(place), two.decay(place)
            )
    return fits


def _enough(rough: WholeDecay, longest_s: float) -> Array:
    """How much of the time after the switch-off is to be fitted. [s].

    Three times until the decay meets the noise, and a second of noise at least: what happens
    later says nothing about the decay. Rounded up to a few lengths, so that bands share a fit.
    """
    with np.errstate(divide="ignore", over="ignore"):
        meets = rough.time_s[0] / 6.0 * np.log10(np.maximum(rough.amplitude[0] / rough.floor, 1.0))
    needed = np.clip(np.maximum(3.0 * meets, meets + 1.0), 1.0, longest_s)
    rounded: Array = 1.25 ** np.ceil(np.log(needed) / np.log(1.25))
    return rounded


@dataclass(frozen=True, slots=True)
class Scatter:
    """What the energies do about a fit."""

    relative: float
    """Mean square over that of noise alone. [-]"""
    excess: float
    """Root mean square, relative to the fit, that noise does not explain. [-]"""
    irregular: bool
    """More than chance, and enough to matter."""

    @property
    def hopeless(self) -> bool:
        """No decay of noise at all."""
        return self.irregular and self.excess > HOPELESS


def scatter_about(best: WholeDecay, fit: Fits, degrees: float) -> Scatter:
    """Scatter of the energies about a fit; `degrees` independent complex samples in a frame.

    A gate, a slammed door, a recorder that rides its gain leave more than fluctuating noise can.
    Pearson's statistic of gamma variates; five of its standard deviations,
    sqrt((2 + 6/degrees)/frames), count as more than chance.
    """
    size = min(max(int(np.ceil(REGULAR_DEGREES / degrees)), 1), len(fit.energy) // 4)
    ratio = grouped(fit.energy, size) / grouped(best.mean(fit.time), size)
    square = float(np.mean((ratio - 1.0) ** 2))
    expected = 1.0 / (degrees * size)
    spread = np.sqrt((2.0 + 6.0 * expected) / len(ratio))
    excess = float(np.sqrt(max(square - expected, 0.0)))
    irregular = square > expected * (1.0 + 5.0 * spread) and excess > MATTERS
    return Scatter(square / expected, excess, irregular)
