"""Predictions against what a user would otherwise run. ``pytest tests/benchmarks/test_predict.py -m benchmark -s``."""

import time

import numpy as np
import pytest

from planner.predict import reverberation as rt
from planner.predict.screening import screen

pytestmark = pytest.mark.benchmark

VOLUME, SURFACE = 52.0, 88.0


def best(action, repeats=5):
    """Shortest of several runs. [s]"""
    times = []
    for _ in range(repeats):
        began = time.perf_counter()
        action()
        times.append(time.perf_counter() - began)
    return min(times)


def test_a_million_options_against_a_bare_matrix_product():
    """1,000,000 options × 24 items × 8 bands, Sabine and Eyring (aim: at most 4 ×)."""
    rng = np.random.default_rng(1)
    areas, gain = rng.uniform(0, 2, (1_000_000, 24)), rng.uniform(0.1, 0.9, (24, 8))
    base, m = rng.uniform(5, 12, 8), np.full(8, 1e-3)

    def ours():
        for block in screen(
            areas, gain, base, volume=VOLUME, surface_area=SURFACE, air_attenuation=m
        ):
            last = block
        return last

    product = np.empty((len(areas), 8))
    last = ours()
    np.matmul(areas, gain, out=product)
    a = product[last.start :] + base
    assert last.sabine == pytest.approx(24 * np.log(10) / 343 * VOLUME / (a + 4 * m * VOLUME))
    ratio = best(ours) / best(lambda: np.matmul(areas, gain, out=product))
    print(
        f"\n1,000,000 options × 8 bands, two formulas: {ratio:.1f} × a bare matrix product (aim 4)"
    )


def test_all_formulas_against_a_loop_over_a_library():
    """100,000 options × 8 bands × six formulas, against pyroomacoustics' own two in a Python loop (2,000 timed, scaled up)."""
    from pyroomacoustics.acoustics import rt60_eyring, rt60_sabine

    rng = np.random.default_rng(2)
    count, loop = 100_000, 2_000
    normal = np.array([(0, 0, 1), (0, 0, -1), (0, 1, 0), (0, -1, 0), (1, 0, 0), (-1, 0, 0)], float)
    area = np.array([20.3, 20.3, 13.5, 13.5, 10.1, 10.1])
    alpha = rng.uniform(0.05, 0.7, (count, 6, 8))

    def ours(values):
        mean = np.einsum("p,opb->ob", area, values) / area.sum()
        axes = rt.axis_shares(area, normal, values)
        return {
            "sabine": rt.sabine(VOLUME, mean * area.sum()),
            "eyring": rt.eyring(VOLUME, area.sum(), mean),
            "millington_sette": rt.millington_sette(VOLUME, area, values),
            "kuttruff": rt.kuttruff(
                VOLUME, area.sum(), mean, unevenness=rt.uneven_absorption(area, values)
            ),
            "fitzroy": rt.fitzroy(VOLUME, *axes),
            "arau_puchades": rt.arau_puchades(VOLUME, *axes),
        }

    def theirs():
        found = np.empty((loop, 2, 8))
        for option in range(loop):
            for band in range(8):
                mean = float(area @ alpha[option, :, band]) / area.sum()
                found[option, 0, band] = rt60_sabine(area.sum(), VOLUME, mean, 0.0, 343.0)
                found[option, 1, band] = rt60_eyring(area.sum(), VOLUME, mean, 0.0, 343.0)
        return found

    reference, mine = theirs(), ours(alpha[:loop])
    assert mine["sabine"] == pytest.approx(reference[:, 0])
    assert mine["eyring"] == pytest.approx(reference[:, 1])

    def blocks():
        for start in range(0, count, 2048):
            ours(alpha[start : start + 2048])

    product = rng.uniform(0, 1, (count, 48))
    weights = rng.uniform(0, 1, (48, 8))
    spent = best(blocks, 3)
    print(
        f"\n100,000 options × 8 bands: six formulas {best(theirs, 2) * count / loop / spent:.0f} × faster than a loop "
        f"over a library's two; {spent / best(lambda: product @ weights):.0f} × a bare matrix product"
    )


def test_ten_thousand_arrangements_at_the_seat():
    """Response of a mirrored pair for 10,000 arrangements, against one at a time (200 timed, scaled up)."""
    from planner.predict.modes import rectangular_modes
    from planner.predict.response import frequencies, kernel, level, shape_at
    from planner.predict.seat import pair_levels

    size = (5.2, 3.9, 2.6)
    hz = frequencies(270.0)
    mode_hz, orders = rectangular_modes(size, 460.0)
    answer = kernel(hz, mode_hz, np.full(len(mode_hz), 0.4), float(np.prod(size)))
    rng = np.random.default_rng(3)
    speakers, seats = rng.uniform(0.4, 1.5, (10_000, 3)), rng.uniform(2.0, 2.5, (10_000, 3))

    def one(n):
        mirror = speakers[n] * [1, -1, 1] + [0, size[1], 0]
        pair = shape_at(speakers[n], orders, size) + shape_at(mirror, orders, size)
        return level(answer @ (pair * shape_at(seats[n], orders, size)))

    many = pair_levels(answer, orders, size, speakers[:50], seats[:50], size[1])
    assert many == pytest.approx(np.array([one(n) for n in range(50)]), abs=0.02)
    ours = best(lambda: pair_levels(answer, orders, size, speakers, seats, size[1]), 2)
    loop = best(lambda: [one(n) for n in range(200)], 2) * 50
    print(f"\n10,000 arrangements: {ours:.1f} s, {loop / ours:.1f} × faster than one at a time")
