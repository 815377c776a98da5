"""Modes against published lists, Weyl's count, and the closed form against finite elements."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.air import Air
from planner.errors import RoomError
from planner.predict.modes import (
    coincidences,
    kind_of,
    mode_decay,
    rectangular_modes,
    spacing_index,
    third_octave_count,
    weyl_count,
)
from planner.predict.plan_modes import extruded_modes, plan_modes
from planner.predict.proportions import criteria, rated, search
from planner.predict.room_modes import room_modes
from planner.room.files import parse_room
from planner.room.surfaces import room_surfaces

BOX = ("left", "back", "right", "front")


def same(alpha):
    return {name: np.full(8, alpha) for name in (*BOX, "floor", "ceiling")}


def test_a_published_list():
    """Check room of 7 × 5 × 3 m, c = 344 m/s: six modes up to 60 Hz; 57.3 and 60.0 Hz are printed."""
    hz, orders = rectangular_modes((7, 5, 3), 60, speed_of_sound=344)
    assert hz == pytest.approx([24.57, 34.40, 42.27, 49.14, 57.33, 59.99], abs=0.006)
    assert orders.tolist() == [[1, 0, 0], [0, 1, 0], [1, 1, 0], [2, 0, 0], [0, 0, 1], [2, 1, 0]]
    assert kind_of(orders) == ("axial", "axial", "tangential", "axial", "axial", "tangential")


@given(st.tuples(st.floats(2, 8), st.floats(2, 8), st.floats(2, 4)))
def test_every_mode_up_to_the_limit_is_there(size):
    """Enumerated here with far more orders than needed."""
    hz, _ = rectangular_modes(size, 150)
    n = np.arange(12)
    all_hz = 171.5 * np.sqrt(
        (n[:, None, None] / size[0]) ** 2 + (n[:, None] / size[1]) ** 2 + (n / size[2]) ** 2
    )
    expected = np.sort(all_hz[(all_hz > 0) & (all_hz <= 150)])
    assert hz == pytest.approx(expected)


def test_the_count_follows_weyl():
    """N(f) = 4π/3 V (f/c)³ + π/4 S (f/c)² + L/8 (f/c) (Morse 1948; Kuttruff (3.20)): within 3 % at 500 Hz."""
    size = np.array([5.2, 3.9, 2.6])
    hz, _ = rectangular_modes(size, 500)
    expected = weyl_count(
        500.0, size.prod(), 2 * (5.2 * 3.9 + 5.2 * 2.6 + 3.9 * 2.6), 4 * size.sum()
    )
    by_hand = (
        4 * np.pi / 3 * 52.728 * (500 / 343) ** 3
        + np.pi / 4 * 87.88 * (500 / 343) ** 2
        + 46.8 / 8 * 500 / 343
    )
    assert float(expected) == pytest.approx(by_hand)
    assert len(hz) == pytest.approx(by_hand, rel=0.03)


def test_oblique_modes_decay_as_sabine_says_and_axial_ones_more_slowly():
    """Twice the mean pressure on every wall: 24 ln(10) V / (c S α); an axial mode presses on two walls only."""
    size = (5.0, 4.0, 3.0)
    hz, orders = rectangular_modes(size, 200)
    t = mode_decay(hz, orders, size, same(0.1))
    sabine = 24 * np.log(10) * 60 / (343 * 94 * 0.1)
    kinds = np.array(kind_of(orders))
    assert t[kinds == "oblique"] == pytest.approx(np.full((kinds == "oblique").sum(), sabine))
    # By hand for 1 0 0: S_eff = 2·(2·12) + 2·15 + 2·20 = 118 instead of 2·94 = 188.
    first = np.flatnonzero((orders == [1, 0, 0]).all(axis=1))[0]
    assert t[first] == pytest.approx(sabine * 188 / 118)


def test_third_octave_count_of_the_published_room():
    bands, count = third_octave_count(rectangular_modes((7, 5, 3), 120, speed_of_sound=344)[0], 120)
    assert dict(zip(bands, count, strict=True))[25] == 1  # 24.57 Hz lies between 22.4 and 28.2 Hz
    assert dict(zip(bands, count, strict=True))[31.5] == 1  # 34.40 Hz between 28.2 and 35.5 Hz


def test_coincidences_and_even_spacing():
    assert coincidences([50.0, 52.0, 60.0]) == [(0, 1)]
    assert float(spacing_index(np.arange(20.0, 200.0, 10.0))) == pytest.approx(1.0)


def test_finite_elements_of_a_rectangle_are_its_closed_form():
    """Within 0.2 % up to 300 Hz, all modes found; their decay too."""
    size = (5.3, 3.7, 2.6)
    hz, orders = rectangular_modes(size, 300)
    corners = [(0, 0), (5.3, 0), (5.3, 3.7), (0, 3.7)]
    alpha = {**same(0.1), "left": np.full(8, 0.4), "front": np.full(8, 0.02)}
    found = extruded_modes(corners, 2.6, 300, alpha, BOX)
    assert len(found.hz) == len(hz)
    assert found.hz == pytest.approx(hz, rel=0.002)
    decay = mode_decay(hz, orders, size, alpha)
    apart = np.min(np.abs(hz[:, None] - hz) + 1e9 * np.eye(len(hz)), axis=1) > 0.5
    assert found.t_s[apart] == pytest.approx(decay[apart], rel=0.02)


def test_an_l_shaped_room_against_a_finite_difference_grid():
    """An independent solution: five-point differences on 1/16 m and 1/32 m, extrapolated in h^(4/3)."""
    from scipy.sparse import coo_array
    from scipy.sparse.linalg import eigsh

    def differences(n):
        """Lowest wavenumbers² of 4 × 4 m less its upper right quarter, cell-centred Neumann grid."""
        inside = np.ones((4 * n, 4 * n), bool)
        inside[2 * n :, 2 * n :] = False
        index = np.full(inside.shape, -1)
        index[inside] = np.arange(inside.sum())
        rows, columns = [], []
        for a, b in ((index[:-1], index[1:]), (index[:, :-1], index[:, 1:])):
            both = (a >= 0) & (b >= 0)
            rows += [a[both], b[both]]
            columns += [b[both], a[both]]
        i, j = np.concatenate(rows), np.concatenate(columns)
        size = int(inside.sum())
        off = coo_array((-np.ones(len(i)), (i, j)), shape=(size, size)).tocsc()
        degree = -np.asarray(off.sum(axis=1)).ravel()
        laplace = (
            off
            + coo_array((degree, (np.arange(size), np.arange(size))), shape=(size, size)).tocsc()
        )
        values = np.sort(eigsh(laplace * n**2, 8, sigma=-0.05, return_eigenvectors=False))
        return values[1:]

    coarse, fine = differences(16), differences(32)
    exact = fine + (fine - coarse) / (2 ** (4 / 3) - 1)
    ours = plan_modes([(0, 0), (4, 0), (4, 2), (2, 2), (2, 4), (0, 4)], 3.0).wavenumber[1:8] ** 2
    # Worth of the extrapolation: the singular modes converge with h^(4/3), the others with h².
    assert ours == pytest.approx(exact, rel=0.004)


def test_the_walls_of_a_footprint_are_pressed_on_as_in_the_closed_form():
    """A mode across x presses twice on the two walls across x, and once on the others."""
    plan = plan_modes([(0, 0), (5, 0), (5, 3), (0, 3)], 2.0)
    across_x = int(np.argmin(np.abs(plan.wavenumber - np.pi / 5)))
    assert plan.wall_pressure[across_x] == pytest.approx([1, 2, 1, 2], rel=1e-3)
    points = np.array([(0.0, 0.0), (1.25, 3.0), (2.5, 1.0), (4.0, 2.0), (5.0, 3.0)])
    shape = plan.pressure(points)[across_x]
    assert shape * np.sign(shape[0]) == pytest.approx(np.cos(np.pi * points[:, 0] / 5), abs=2e-3)


def test_published_criteria_of_a_cube_and_of_a_good_room():
    """A cube fails each of them; 1 : 1.26 : 1.59 is Bolt's own proportion."""
    cube = {one.name: one.holds for one in criteria((3, 3, 3))}
    assert not any(
        holds for name, holds in cube.items() if "whole-number" in name or "together" in name
    )
    bolt = criteria((1.59 * 2.6, 1.26 * 2.6, 2.6))
    assert next(one for one in bolt if "published proportion" in one.name).holds


def test_a_search_finds_nothing_worse_than_the_sketch():
    sketch = rated((5.2, 3.9, 2.6))[0]
    best = search((4.7, 5.7), (3.4, 4.4), (2.5, 2.7))
    assert best[0].score < sketch.score
    assert all(4.7 <= one.dimensions[0] <= 5.7 for one in best)
    assert [one.score for one in best] == sorted(one.score for one in best)
    with pytest.raises(RoomError, match="no range"):
        search((5.0, 4.0), (3, 4), (2, 3))


def test_the_modes_of_a_room_file():
    text = (
        'name = "x"\n[shape]\nlength = 5\nwidth = 4\nheight = 3\n[surfaces]\nfloor = "concrete-floor"\n'
        'ceiling = "plasterboard-on-joists"\nwalls = "brick-painted"\n'
    )
    room = parse_room(text)
    found = room_modes(room, room_surfaces(room), Air(), 100.0, 250.0)
    content = found.to_json()
    assert content["modes"][0]["n"] == [1, 0, 0]
    assert content["modes"][0]["hz"] == pytest.approx(343.2 / 10, abs=0.01)
    assert content["modes"][0]["t_s"] > 1
    assert {"band_hz", "count"} == set(content["third_octave_count"][0])
    with pytest.raises(RoomError, match="modes below"):
        room_modes(room, room_surfaces(room), Air(), 5000.0, 250.0)
