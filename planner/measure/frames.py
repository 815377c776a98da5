"""Sums of squared pressure over frames whose edges need not fall on samples."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class Cuts:
    """Where a batch of blocks is cut into pieces, each in one frame and in one block.

    In every block the pieces follow each other without a gap: a block with n pieces has n + 1
    points, and all points stand in one row.
    """

    frame: NDArray[np.intp]
    """Frame of each piece, ascending, shape ``(piece,)``."""
    point: NDArray[np.intp]
    """Point at which each piece begins; it ends at the next one, shape ``(piece,)``."""
    block: NDArray[np.intp]
    """Block of each point, shape ``(point,)``."""
    place: NDArray[np.float64]
    """Place of each point, counted from the first kept sample of its block. [sample]"""


class FrameTotals:
    """Collects band energies, batch after batch, into frames of equal length.

    Parameters
    ----------
    length
        Length of a frame, may be fractional. [sample]
    first
        Beginning of the first frame in the source. [sample]
    bands
        Number of bands.
    """

    def __init__(self, length: float, first: float, bands: int) -> None:
        self.length, self.first, self.bands = length, first, bands
        self.done: list[NDArray[np.float32]] = []  # seven digits: half the memory of a long file
        self.open_frame = 0
        self.open_energy = np.zeros(bands)
        self.pieces = np.zeros((0, bands))

    def cuts(self, begin: int, blocks: int, hop: int) -> Cuts:
        """Cut the batch whose blocks keep `hop` samples each, the first from `begin` on."""
        end = begin + blocks * hop
        start = max(float(begin), self.first)
        last = int(np.ceil((end - self.first) / self.length)) + 1
        edges = self.first + np.arange(self.open_frame, max(last, self.open_frame)) * self.length
        joints = begin + np.arange(blocks + 1) * float(hop)
        inside = np.union1d(edges, joints)
        inside = inside[(inside > start) & (inside < end)]
        marks = np.concatenate([[start], inside, [float(end)]]) if end > start else np.zeros(0)
        middle = 0.5 * (marks[:-1] + marks[1:])
        frame = np.floor((middle - self.first) / self.length).astype(np.intp)
        block = np.floor((middle - begin) / hop).astype(np.intp)
        self.pieces = np.zeros((len(middle), self.bands))
        if not len(middle):
            return Cuts(frame, frame, block, middle)
        ends = np.flatnonzero(np.diff(block, append=block[-1] + 1))  # last piece of each block
        place = np.insert(marks[:-1], ends + 1, marks[ends + 1])
        of_point = np.insert(block, ends + 1, block[ends])
        point = np.arange(len(middle)) + block - block[0]
        return Cuts(frame, point, of_point, place - begin - of_point * float(hop))

    def add(
        self,
        band: int,
        signal: NDArray[np.complex64],
        cuts: Cuts,
        margin: int,
        step: float,
    ) -> None:
        """Take the squared pressure |z|² of one band, shape ``(block, sample)``.

        `step` is the distance of its samples and `margin` the useless beginning of a block, both
        in samples of the source. |z|² is taken as straight between its samples.
        """
        if not len(cuts.frame):
            return
        power = (signal.real**2 + signal.imag**2).ravel()
        place = (cuts.place + margin) / step
        whole = place.astype(np.intp)
        at = whole + cuts.block * signal.shape[1]
        sums = np.add.reduceat(power, at, dtype=float)
        sums[:-1][at[:-1] == at[1:]] = 0.0
        # Trapezium sums from sample to sample, and the part of a trapezium at either end.
        here = power[at].astype(float)
        following = power[np.minimum(at + 1, len(power) - 1)]
        beyond = place - whole
        part = beyond * (here + 0.5 * beyond * (following - here)) + 0.5 * here
        sums[:-1] += np.diff(part)
        self.pieces[:, band] = np.maximum(sums[cuts.point], 0.0) * step

    def close(self, cuts: Cuts) -> None:
        """Join the pieces of the batch to frames; the last one stays open."""
        if not len(cuts.frame):
            return
        starts = np.flatnonzero(np.diff(cuts.frame, prepend=-1))
        frames = np.add.reduceat(self.pieces, starts, axis=0)
        if cuts.frame[0] == self.open_frame:
            frames[0] += self.open_energy
        self.done.append((frames[:-1] / self.length).astype(np.float32))
        self.open_frame, self.open_energy = int(cuts.frame[-1]), frames[-1]

    def whole_frames(self, total: int) -> NDArray[np.float64]:
        """Mean squared pressure of the frames that end within `total` samples."""
        count = int(np.floor((total - self.first) / self.length + 1e-9))
        if count <= 0 or not self.done:
            return np.zeros((0, self.bands))
        energy = np.empty((count, self.bands))
        filled = 0
        last = (self.open_energy[None] / self.length).astype(np.float32)
        for part in [*self.done, last]:
            taken = part[: count - filled]
            energy[filled : filled + len(taken)] = taken
            filled += len(taken)
        return energy[:filled]
