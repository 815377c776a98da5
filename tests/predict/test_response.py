"""The bass at a seat against an image-source sum, and what must hold whatever the room."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.air import Air
from planner.errors import RoomError
from planner.predict.modes import rectangular_modes
from planner.predict.response import (
    boundary_interference,
    extremes,
    frequencies,
    kernel,
    level,
    shape_at,
    unevenness,
)
from planner.predict.seat import better_places, pair_levels, seat
from planner.room.files import parse_room
from planner.room.geometry import geometry
from planner.room.surfaces import room_surfaces

C = 343.0
SIZE = (5.0, 4.0, 2.6)
ROOM = (
    'name = "x"\n[shape]\nlength = 5.0\nwidth = 4.0\nheight = 2.6\n[surfaces]\nfloor = "carpet-on-underlay"\n'
    'ceiling = "plasterboard-on-joists"\nwalls = "plasterboard-on-studs"\n'
    "[positions]\nseat = [3.1, 2.0, 1.2]\nloudspeakers = [[1.0, 1.2, 1.2], [1.0, 2.8, 1.2]]\n"
)


def by_modes(hz, source, receiver, time_s, highest=800.0):
    mode_hz, orders = rectangular_modes(SIZE, highest)
    mode_hz = np.concatenate([[0.0], mode_hz])
    orders = np.concatenate([np.zeros((1, 3), int), orders])
    answer = kernel(hz, mode_hz, np.full(len(mode_hz), time_s), float(np.prod(SIZE)))
    return answer @ (shape_at(source, orders, SIZE) * shape_at(receiver, orders, SIZE))


def by_images(hz, source, receiver, time_s, reach=24):
    """Rigid walls, and a medium that takes e^(−δ r/c): Σ e^(−jkr) e^(−δr/c)/r over all images."""
    delta = 3 * np.log(10) / time_s / C
    axes = []
    for x0, x1, size in zip(source, receiver, SIZE, strict=True):
        n = np.arange(-reach, reach + 1)
        axes.append(np.concatenate([2 * n * size + x0 - x1, 2 * n * size - x0 - x1]))
    r = np.sqrt(axes[0][:, None, None] ** 2 + axes[1][:, None] ** 2 + axes[2] ** 2).ravel()
    r = r[r < 170]
    k = 2 * np.pi * np.asarray(hz)[:, None] / C
    return np.array([np.sum(np.exp(-(1j * one + delta) * r) / r) for one in k.ravel()])


@pytest.mark.parametrize(
    ("source", "receiver"),
    [
        ((1.0, 1.2, 1.2), (3.4, 2.7, 1.2)),
        ((0.4, 0.5, 0.6), (4.2, 3.1, 1.9)),
        ((1.0, 2.0, 1.2), (3.1, 2.0, 1.2)),
    ],
)
def test_the_sum_over_modes_equals_the_sum_over_images(source, receiver):
    """Independent solution of the same lightly damped rectangle (T = 0.5 s): within 1 dB at peaks, away from the source."""
    hz = np.arange(25.0, 180.0, 1.0)
    modes = level(by_modes(hz, source, receiver, 0.5))
    images = level(by_images(hz, source, receiver, 0.5))
    from scipy.signal import find_peaks

    # Not the shoulders of a dip, nor the ripple that a sum of images cut off at 170 m leaves in one.
    peaks = find_peaks(images, prominence=3.0, height=images.max() - 20.0)[0]
    assert len(peaks) >= 4
    assert np.abs(modes - images)[peaks].max() < 1.0


points = st.tuples(*(st.floats(0.1, size - 0.1) for size in SIZE))


@settings(max_examples=30)
@given(points, points)
def test_reciprocity(a, b):
    hz = np.array([30.0, 55.0, 90.0])
    assert by_modes(hz, a, b, 0.4, 200) == pytest.approx(by_modes(hz, b, a, 0.4, 200))


@settings(max_examples=30)
@given(points, points)
def test_mirrored_rooms_answer_alike(a, b):
    """Symmetry: both points mirrored about the axis give the same response."""
    hz = np.array([30.0, 55.0, 90.0])
    mirror = [(x, SIZE[1] - y, z) for x, y, z in (a, b)]
    assert by_modes(hz, a, b, 0.4, 200) == pytest.approx(by_modes(hz, *mirror, 0.4, 200))


def test_shapes_are_normalised():
    """Mean square one over the room, by a fine midpoint sum."""
    _, orders = rectangular_modes(SIZE, 90)
    axes = [(np.arange(20) + 0.5) / 20 * size for size in SIZE]
    grid = np.stack(np.meshgrid(*axes, indexing="ij"), -1).reshape(-1, 3)
    assert np.mean(shape_at(grid, orders, SIZE) ** 2, axis=0) == pytest.approx(np.ones(len(orders)))


def test_the_quarter_wave_rule():
    """A loudspeaker 0.8 m before the front wall heard on its axis: c/(4 d) = 107 Hz (common practice)."""
    frames = geometry(parse_room(ROOM)).frames
    found = {one.surface: one for one in boundary_interference(frames, (0.8, 2, 1.2), (4, 2, 1.2))}
    assert found["front"].hz == pytest.approx(C / (4 * 0.8))
    assert found["floor"].excess == pytest.approx(np.hypot(3.2, 2.4) - 3.2)


def test_peaks_and_dips_are_named():
    """One mode alone at 60 Hz makes one peak there, by itself."""
    hz = frequencies(200.0)
    parts = kernel(hz, [0.0, 60.0], [3.0, 0.5], 52.0)
    peak = next(one for one in extremes(hz, parts) if one.is_peak)
    assert peak.hz == pytest.approx(60, rel=0.03)
    assert peak.modes[0] == 1


def test_unevenness_of_a_flat_and_a_tilted_curve():
    hz = frequencies(200.0)
    assert float(unevenness(np.full(len(hz), 3.0), hz)) == pytest.approx(0)
    slope = 6.0 * np.log2(hz)
    width = 6.0 * np.log2(hz[-9] / hz[0])  # a third of an octave is lost by smoothing
    assert float(unevenness(slope, hz)) == pytest.approx(width / np.sqrt(12), rel=0.03)


def test_a_seat_in_a_room_and_a_better_place():
    room = parse_room(ROOM)
    surfaces = room_surfaces(room)
    found = seat(room, surfaces, Air(), 200.0)
    assert [one.name for one in found.responses] == ["loudspeaker 1", "loudspeaker 2", "together"]
    # A symmetric pair answers alike at a seat on the axis.
    assert found.responses[0].level_db == pytest.approx(found.responses[1].level_db)
    assert found.responses[2].level_db == pytest.approx(
        found.responses[0].level_db + 20 * np.log10(2)
    )
    assert len(found.reflections) >= 12
    assert any(area.surface == "left" for area in found.areas)
    better = better_places(room, surfaces, Air(), 200.0)
    assert better.after_db < better.before_db
    left, right = better.loudspeakers
    assert left[1] + right[1] == pytest.approx(4.0)
    assert better.seat[1] == pytest.approx(2.0)


def test_many_arrangements_equal_one_by_one():
    hz = frequencies(150.0)
    mode_hz, orders = rectangular_modes(SIZE, 250)
    answer = kernel(hz, mode_hz, np.full(len(mode_hz), 0.5), 52.0)
    rng = np.random.default_rng(1)
    speakers, seats = rng.uniform(0.4, 1.8, (5, 3)), rng.uniform(2.0, 2.5, (5, 3))
    many = pair_levels(answer, orders, SIZE, speakers, seats, SIZE[1])
    for n in range(5):
        mirror = speakers[n] * [1, -1, 1] + [0, SIZE[1], 0]
        weights = (shape_at(speakers[n], orders, SIZE) + shape_at(mirror, orders, SIZE)) * shape_at(
            seats[n], orders, SIZE
        )
        assert many[n] == pytest.approx(level(answer @ weights), abs=0.01)


@pytest.mark.parametrize(
    ("there", "instead", "words"),
    [
        ("seat = [3.1, 2.0, 1.2]\n", "", "no seat"),
        ("loudspeakers = [[1.0, 1.2, 1.2], [1.0, 2.8, 1.2]]\n", "", "no loudspeaker"),
        ("[1.0, 1.2, 1.2]", "[3.1, 2.0, 1.2]", "stands at the seat"),
    ],
)
def test_rooms_without_places_are_refused(there, instead, words):
    room = parse_room(ROOM.replace(there, instead, 1))
    with pytest.raises(RoomError, match=words):
        seat(room, room_surfaces(room), Air(), 200.0)
