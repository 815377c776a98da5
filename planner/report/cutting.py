"""Cutting lengths from stock: which bars to buy and how to cut them, proven to be the fewest.

Every cutting pattern that cannot take another piece is listed, and the number of bars cut by each
is chosen by integer programming (HiGHS), so the answer is exact. Lengths are counted in tenths of a
millimetre, in whole numbers, so that rounding cannot make a piece fit that does not.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

PER_METRE = 10_000
"""Length units in a metre. [1/m]"""
MOST_PATTERNS = 60_000


@dataclass(frozen=True, slots=True)
class Bar:
    """One way to cut a stock length, and how many bars are cut so."""

    stock: float
    """[m]"""
    pieces: tuple[float, ...]
    """Longest first. [m]"""
    count: int
    left: float
    """What is left of each after pieces and saw cuts. [m]"""


@dataclass(frozen=True, slots=True)
class CuttingPlan:
    """Bars to buy."""

    bars: tuple[Bar, ...]
    proven: bool
    """No plan with less stock exists."""

    @property
    def count(self) -> int:
        """Bars in all."""
        return sum(bar.count for bar in self.bars)

    @property
    def bought(self) -> float:
        """Length of all the bars. [m]."""
        return sum(bar.count * bar.stock for bar in self.bars)

    @property
    def used(self) -> float:
        """Length of all the pieces. [m]."""
        return sum(bar.count * sum(bar.pieces) for bar in self.bars)

    @property
    def waste(self) -> float:
        """Share of the stock that becomes no piece. [-]."""
        return 1.0 - self.used / self.bought if self.bought else 0.0

    @property
    def by_stock(self) -> dict[float, int]:
        """Number of bars of each stock length. [m] → count."""
        counts: dict[float, int] = {}
        for bar in self.bars:
            counts[bar.stock] = counts.get(bar.stock, 0) + bar.count
        return dict(sorted(counts.items()))


def cut_lengths(
    pieces: Mapping[float, int], stock: Sequence[float], *, kerf: float = 0.003
) -> CuttingPlan:
    """The least stock from which all the pieces can be cut.

    Least total length of stock, and the fewest bars among plans of that length. Each cut between
    two pieces takes the width of the saw blade; the last piece of a bar may be its end.

    Parameters
    ----------
    pieces
        How many of each length. [m] → count
    stock
        Lengths that can be bought. [m]
    kerf
        Width of a saw cut. [m]

    Raises
    ------
    ValueError
        No stock, a length that is not positive, or a piece longer than any stock.

    Notes
    -----
    Up to 60 000 cutting patterns the plan is proven; beyond (dozens of different lengths in one
    job) the pieces are packed longest first, and `CuttingPlan.proven` is true only where that
    reaches the bound by length.
    """
    wanted = {round(length * PER_METRE): n for length, n in pieces.items() if n > 0}
    bars = sorted({round(length * PER_METRE) for length in stock})
    blade = round(kerf * PER_METRE)
    if not wanted:
        return CuttingPlan((), True)
    if not bars or bars[0] <= 0 or min(wanted) <= 0 or blade < 0:
        raise ValueError("stock and pieces need positive lengths")
    if max(wanted) > bars[-1]:
        longest = max(wanted) / PER_METRE
        raise ValueError(
            f"a piece of {longest:g} m is longer than any stock ({bars[-1] / PER_METRE:g} m)"
        )
    lengths = sorted(wanted, reverse=True)
    demand = np.array([wanted[length] for length in lengths])
    patterns: list[tuple[int, tuple[int, ...]]] = []
    for bar in bars:
        for pattern in _patterns(lengths, demand, bar + blade, blade):
            patterns.append((bar, pattern))
            if len(patterns) > MOST_PATTERNS:
                return _longest_first(lengths, demand, bars, blade)
    return _chosen(lengths, demand, patterns, blade)


def _patterns(
    lengths: Sequence[int], demand: NDArray[np.intp], room: int, blade: int
) -> Iterator[tuple[int, ...]]:
    """Every way to fill a bar to which no wanted piece can be added."""
    counts = [0] * len(lengths)

    def fill(kind: int, left: int) -> Iterator[tuple[int, ...]]:
        if kind == len(lengths):
            more = any(
                length + blade <= left and counts[n] < demand[n] for n, length in enumerate(lengths)
            )
            if not more and any(counts):
                yield tuple(counts)
            return
        most = min(left // (lengths[kind] + blade), int(demand[kind]))
        for number in range(most, -1, -1):
            counts[kind] = number
            yield from fill(kind + 1, left - number * (lengths[kind] + blade))
        counts[kind] = 0

    yield from fill(0, room)


def _chosen(
    lengths: Sequence[int],
    demand: NDArray[np.intp],
    patterns: Sequence[tuple[int, tuple[int, ...]]],
    blade: int,
) -> CuttingPlan:
    """How many bars to cut by each pattern: least length, then fewest bars."""
    from scipy.optimize import Bounds, LinearConstraint, milp

    if not patterns:
        raise ValueError("no piece fits the stock")
    matrix = np.array([pattern for _, pattern in patterns]).T
    stock = np.array([bar for bar, _ in patterns], float)
    unit = float(np.gcd.reduce(stock.astype(int)))
    # One bar weighs less than the smallest difference in length that two plans can have.
    cost = stock / unit + 1.0 / (demand.sum() + 1.0)
    answer = milp(
        cost,
        constraints=LinearConstraint(matrix, demand, np.inf),
        integrality=np.ones(len(cost)),
        bounds=Bounds(0, float(demand.sum())),
        options={"mip_rel_gap": 0.0, "time_limit": 20.0},
    )
    if answer.x is None:
        return _longest_first(lengths, demand, sorted({bar for bar, _ in patterns}), blade)
    counts = np.rint(answer.x).astype(int)
    rest = demand.copy()
    bars: list[Bar] = []
    for (bar, pattern), count in zip(patterns, counts, strict=True):
        for _ in range(count):
            # Patterns may hold more pieces than are still wanted; those are not cut.
            cut = np.minimum(pattern, rest)
            rest -= cut
            bars.append(_bar(bar, cut, lengths, blade))
    return CuttingPlan(_grouped(bars), bool(answer.status == 0))


def _longest_first(
    lengths: Sequence[int], demand: NDArray[np.intp], bars: Sequence[int], blade: int
) -> CuttingPlan:
    """First-fit with decreasing lengths into the longest stock."""
    stock = bars[-1]
    left: list[int] = []
    cuts: list[NDArray[np.intp]] = []
    for kind, length in enumerate(lengths):
        for _ in range(int(demand[kind])):
            place = next((n for n, room in enumerate(left) if room >= length + blade), None)
            if place is None:
                left.append(stock + blade)
                cuts.append(np.zeros(len(lengths), dtype=np.intp))
                place = len(left) - 1
            left[place] -= length + blade
            cuts[place][kind] += 1
    needed = sum((length + blade) * int(n) for length, n in zip(lengths, demand, strict=True))
    least = -(-needed // (stock + blade))
    plan = [_bar(stock, cut, lengths, blade) for cut in cuts]
    return CuttingPlan(_grouped(plan), len(bars) == 1 and len(plan) == least)


def _bar(stock: int, cut: NDArray[np.intp], lengths: Sequence[int], blade: int) -> Bar:
    pieces = [length for length, n in zip(lengths, cut, strict=True) for _ in range(int(n))]
    left = max(stock - sum(pieces) - blade * len(pieces), 0)
    return Bar(stock / PER_METRE, tuple(piece / PER_METRE for piece in pieces), 1, left / PER_METRE)


def _grouped(bars: Sequence[Bar]) -> tuple[Bar, ...]:
    groups: dict[tuple[float, tuple[float, ...]], Bar] = {}
    for bar in bars:
        key = (bar.stock, bar.pieces)
        count = groups[key].count + 1 if key in groups else 1
        groups[key] = Bar(bar.stock, bar.pieces, count, bar.left)
    return tuple(sorted(groups.values(), key=lambda bar: (-bar.count, bar.left, bar.pieces)))
