"""Volumes, areas and frames, against hand sums and a published example."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.room.files import parse_room
from planner.room.geometry import geometry

FINISHES = '[surfaces]\nfloor = "concrete-smooth"\nceiling = "concrete-smooth"\nwalls = "concrete-smooth"\n'


def rectangle(length, width, height):
    return parse_room(
        f'name = "x"\n[shape]\nlength = {length}\nwidth = {width}\nheight = {height}\n{FINISHES}'
    )


def polygon(corners, height=2.5):
    return parse_room(
        f'name = "x"\n[shape]\nfootprint = {[[float(x) for x in c] for c in corners]}\nheight = {height}\n{FINISHES}'
    )


def test_a_published_room():
    """EN 12354-6:2003, annex E, case 1: 4.54 × 2.73 × 2.40 m, areas 12.39, 10.90 and 6.55 m²."""
    shape = geometry(rectangle(4.54, 2.73, 2.40))
    assert shape.volume == pytest.approx(29.75, abs=0.005)
    assert shape.areas["floor"] == pytest.approx(12.39, abs=0.005)
    assert shape.areas["left"] == pytest.approx(10.90, abs=0.005)
    assert shape.areas["front"] == pytest.approx(6.55, abs=0.005)


def test_mean_free_path_of_a_cube():
    """4 V / S of a cube of 3 m: 4 · 27 / 54 = 2 m (Kuttruff, Room Acoustics, mean free path)."""
    assert geometry(rectangle(3, 3, 3)).mean_free_path == pytest.approx(2.0)


def test_an_l_shaped_room_by_hand():
    """6 × 4 m less a 2 × 1.5 m corner: 21 m² of floor, 20 m of wall."""
    shape = geometry(polygon([(0, 0), (6, 0), (6, 2.5), (4, 2.5), (4, 4), (0, 4)]))
    assert shape.floor_area == pytest.approx(21.0)
    assert shape.perimeter == pytest.approx(20.0)
    assert shape.volume == pytest.approx(52.5)
    assert shape.surface_area == pytest.approx(2 * 21 + 20 * 2.5)


def test_walls_face_inwards_and_are_measured_from_the_left():
    """Seen from the seat towards the front (−x), left is y = 0 and right is y = width."""
    frames = geometry(rectangle(5, 4, 2.5)).frames
    assert frames["front"].origin == pytest.approx([0, 0, 0])
    assert frames["front"].right == pytest.approx([0, 1, 0])
    assert frames["front"].normal == pytest.approx([1, 0, 0])
    assert frames["left"].origin == pytest.approx([5, 0, 0])
    assert frames["left"].normal == pytest.approx([0, 1, 0])
    assert frames["back"].origin == pytest.approx([5, 4, 0])
    assert frames["right"].origin == pytest.approx([0, 4, 0])
    assert frames["ceiling"].normal == pytest.approx([0, 0, -1])


@given(
    st.lists(st.tuples(st.floats(0.05, 6.2), st.floats(1.0, 6.0)), min_size=4, max_size=9),
    st.floats(2.0, 4.0),
)
def test_frames_close_the_room(polar, height):
    """Divergence theorem: the outward areas of a closed surface sum to zero, and give its volume."""
    angles = sorted(angle for angle, _ in polar)
    if (
        min(np.diff([*angles, angles[0] + 2 * np.pi])) < 0.1
        or max(np.diff([*angles, angles[0] + 2 * np.pi])) > 3.0
    ):
        return
    corners = [(r * np.cos(a), r * np.sin(a)) for a, (_, r) in zip(angles, polar, strict=True)]
    shape = geometry(polygon(corners, height))
    total = sum(shape.areas[name] * frame.normal for name, frame in shape.frames.items())
    assert total == pytest.approx(np.zeros(3), abs=1e-9)
    flux = -sum(
        shape.areas[name] * float(frame.origin @ frame.normal)
        for name, frame in shape.frames.items()
    )
    assert flux / 3 == pytest.approx(shape.volume)


@given(st.floats(0, 1), st.floats(0, 1))
def test_surface_coordinates_read_back(a, b):
    for frame in geometry(rectangle(5, 4, 2.5)).frames.values():
        uv = [a * frame.width, b * frame.height]
        assert frame.to_surface(frame.to_room(uv)) == pytest.approx(uv)
