"""Pressure of modes in plan, against the closed form of a rectangle and against symmetry."""

import numpy as np
import pytest

from planner.errors import RoomError
from planner.predict.mode_shapes import plan_pressure
from planner.predict.modes import rectangular_modes
from planner.predict.plan_modes import extruded_modes, plan_modes

BOX = np.array([(0.0, 0.0), (5.2, 0.0), (5.2, 3.9), (0.0, 3.9)])


def at(field, x, y):
    return field.pressure[np.abs(field.y - y).argmin(), np.abs(field.x - x).argmin()]


def test_the_first_mode_is_loud_at_the_ends_and_silent_half_way():
    """Textbook: cos(π x / L) is 1 at the wall, 0.707 after a quarter, 0 half way."""
    field = plan_pressure(BOX, (1, 0, 0), rectangle=True, highest_hz=100)
    assert abs(at(field, 0.0, 1.0)) == pytest.approx(1.0, abs=0.01)
    assert abs(at(field, 1.3, 3.0)) == pytest.approx(2**-0.5, abs=0.03)
    assert abs(at(field, 2.6, 2.0)) < 0.04
    assert at(field, 0.0, 1.0) * at(field, 5.2, 1.0) < 0


def test_elements_agree_with_the_closed_form_in_a_rectangle():
    """The same room as four corners: |pressure| of its simple modes is that of the cosines."""
    silent = {name: np.zeros(8) for name in ("floor", "ceiling", "a", "b", "c", "d")}
    found = extruded_modes(BOX, 2.6, 100.0, silent, ["a", "b", "c", "d"])
    hz, orders = rectangular_modes((5.2, 3.9, 2.6), 100.0)
    for number in (0, 1, 2):  # 33, 44 and 55 Hz, well apart
        assert found.hz[number] == pytest.approx(hz[number], rel=0.002)
        ours = plan_pressure(BOX, found.orders[number], rectangle=False, highest_hz=100.0)
        true = plan_pressure(BOX, orders[number], rectangle=True, highest_hz=100.0)
        difference = np.abs(np.abs(ours.pressure) - np.abs(true.pressure))
        assert np.nanmax(difference) < 0.01


def test_outside_of_an_l_there_is_nothing_and_its_mirror_has_the_same_pressure():
    corners = np.array([(0, 0), (4, 0), (4, 2), (2, 2), (2, 4), (0, 4)], float)
    field = plan_pressure(corners, (1, 0, 0), rectangle=False, highest_hz=120.0)
    assert np.isnan(at(field, 3.0, 3.0))
    share = np.isfinite(field.pressure).mean()
    assert share == pytest.approx(0.75, abs=0.02)  # 12 of 16 m², by hand
    # The plan is its own mirror image about x = y, so that a single mode is as loud on both sides.
    assert np.abs(field.pressure) == pytest.approx(np.abs(field.pressure.T), abs=0.02, nan_ok=True)


def test_a_mode_that_there_is_not():
    assert len(plan_modes(BOX, 1.0).wavenumber) < 50
    with pytest.raises(RoomError, match="no mode 999"):
        plan_pressure(BOX, (999, 0, 0), rectangle=False, highest_hz=60.0)
