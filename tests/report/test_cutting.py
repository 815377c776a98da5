"""Cutting equals exhaustive search; packs are never short and never one too many."""

import itertools
import math
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.report.cutting import cut_lengths
from planner.report.raw_goods import whole_packs


def fits(pieces, stock, kerf):
    """Pieces next to each other with a cut between neighbours; the last may be the bar's end."""
    return sum(pieces) + kerf * (len(pieces) - 1) <= stock


def groupings(items):
    """Every way to share items out among any number of bars (set partitions)."""
    if not items:
        yield []
        return
    first, *rest = items
    for grouping in groupings(rest):
        yield [[first], *grouping]
        for n in range(len(grouping)):
            yield [*grouping[:n], [first, *grouping[n]], *grouping[n + 1 :]]


def exhaustive(pieces, stock, kerf):
    """Least (length, bars) over all set partitions, each group on the shortest bar that holds it."""
    best = None
    for grouping in groupings(pieces):
        total = 0
        for group in grouping:
            bars = [length for length in stock if fits(group, length, kerf)]
            if not bars:
                break
            total += min(bars)
        else:
            key = (total, len(grouping))
            best = key if best is None else min(best, key)
    return best


@given(
    st.lists(st.integers(200, 2400), min_size=1, max_size=7),
    st.sets(st.sampled_from([2400, 3000, 3600, 4800]), min_size=1, max_size=3),
    st.integers(0, 5),
)
@settings(max_examples=80, deadline=None)
def test_plan_equals_exhaustive_search(pieces, stock, kerf):
    """Whole millimetres; up to seven pieces have at most 877 groupings (Bell numbers)."""
    counts = {length / 1000: pieces.count(length) for length in set(pieces)}
    plan = cut_lengths(counts, [length / 1000 for length in stock], kerf=kerf / 1000)
    assert plan.proven
    assert (round(plan.bought * 1000), plan.count) == exhaustive(pieces, sorted(stock), kerf)


@given(
    st.lists(st.integers(100, 2400), min_size=1, max_size=12),
    st.sampled_from([(2400,), (2400, 3000, 4800)]),
)
@settings(max_examples=15, deadline=None)
def test_plan_yields_every_piece_and_no_bar_holds_too_much(pieces, stock):
    counts = {length / 1000: pieces.count(length) for length in set(pieces)}
    plan = cut_lengths(counts, [length / 1000 for length in stock], kerf=0.003)
    made = [
        round(piece * 1000) for bar in plan.bars for _ in range(bar.count) for piece in bar.pieces
    ]
    assert sorted(made) == sorted(pieces)
    for bar in plan.bars:
        assert round(bar.stock * 1000) in stock
        assert fits([round(p * 1000) for p in bar.pieces], round(bar.stock * 1000), 3)
        assert bar.left >= 0


def test_kerf_decides_at_the_edge():
    """Two pieces of 1.2 m fill 2.4 m only when the saw takes nothing; worked by hand."""
    assert cut_lengths({1.2: 2}, [2.4], kerf=0.0).count == 1
    assert cut_lengths({1.2: 2}, [2.4], kerf=0.003).count == 2
    assert cut_lengths({1.1985: 2}, [2.4], kerf=0.003).count == 1


def test_many_different_lengths_are_cut_with_every_bar_full_enough():
    """Beyond the listed patterns pieces go longest first: never above twice the bound by length."""
    counts = {round(0.3 + 0.017 * n, 3): 2 for n in range(70)}
    plan = cut_lengths(counts, [2.4], kerf=0.003)
    needed = sum((length + 0.003) * n for length, n in counts.items())
    assert plan.count <= 2 * math.ceil(needed / 2.403)
    assert sum(bar.count * len(bar.pieces) for bar in plan.bars) == 140


def test_pieces_that_fit_no_stock_are_refused():
    with pytest.raises(ValueError, match=r"3\.2 m is longer than any stock \(3 m\)"):
        cut_lengths({3.2: 1}, [2.4, 3.0])
    with pytest.raises(ValueError, match="positive"):
        cut_lengths({0.0: 1}, [2.4])


@given(st.integers(1, 10_000), st.integers(1, 500))
def test_packs_are_never_short_and_never_one_too_many(needed, pack):
    packs = whole_packs(needed, pack)
    assert packs * pack >= needed
    assert (packs - 1) * pack < needed


@given(st.integers(1, 3000), st.sampled_from([1, 3, 7, 12, 25, 50, 144]))
def test_packs_of_decimal_sizes(hundredths, pack):
    """The same in hundredths, against exact fractions: sums of decimals must not buy one more."""
    needed = math.fsum([0.01] * hundredths)
    exact = math.ceil(Fraction(hundredths, pack))
    assert whole_packs(needed, pack / 100) == exact


def test_exhaustive_search_counts_as_many_groupings_as_there_are():
    """Bell numbers 1, 2, 5, 15, 52 (Abramowitz & Stegun, table 24.2): the oracle itself."""
    sizes = [sum(1 for _ in groupings(list(range(n)))) for n in range(1, 6)]
    assert sizes == [1, 2, 5, 15, 52]
    assert all(fits(c, 10, 0) for c in itertools.combinations([1, 2, 3], 2))
