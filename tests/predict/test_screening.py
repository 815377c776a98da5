"""Many options at once equal one by one, with the formulas written out here."""

import numpy as np
import pytest

from planner.predict.screening import screen


@pytest.mark.parametrize("count", [1, 7, 4096, 5000])
def test_blocks_equal_the_formulas(count):
    """Sabine k V/(A + 4mV), Eyring k V/(−S ln(1 − A/S) + 4mV), k = 24 ln(10)/343."""
    rng = np.random.default_rng(1)
    areas, gain = rng.uniform(0, 4, (count, 5)), rng.uniform(0.1, 0.9, (5, 8))
    base, m = rng.uniform(5, 12, 8), rng.uniform(0, 0.03, 8)
    sabine, eyring = np.empty((count, 8)), np.empty((count, 8))
    for block in screen(areas, gain, base, volume=52.0, surface_area=88.0, air_attenuation=m):
        rows = slice(block.start, block.start + len(block.sabine))
        sabine[rows], eyring[rows] = block.sabine, block.eyring
    a = areas @ gain + base
    k = 24 * np.log(10) / 343
    assert sabine == pytest.approx(k * 52 / (a + 4 * m * 52))
    assert eyring == pytest.approx(k * 52 / (-88 * np.log(1 - a / 88) + 4 * m * 52))


def test_a_room_full_of_absorbers_stays_finite():
    block = next(screen([[100.0]], [[1.2] * 8], [10.0] * 8, volume=52.0, surface_area=88.0))
    assert np.all(np.isfinite(block.eyring))
    assert np.all(block.eyring > 0)
