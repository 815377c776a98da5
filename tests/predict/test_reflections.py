"""Reflections against a reference library's image sources, and by hand."""

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from planner.bands import OCTAVES
from planner.predict.reflections import mirrored, reflections, serving_area
from planner.room.files import parse_room
from planner.room.geometry import geometry

C = 343.0
FINISHES = (
    '[surfaces]\nfloor = "concrete-floor"\nceiling = "concrete-floor"\nwalls = "concrete-floor"\n'
)


def frames_of(shape):
    return geometry(parse_room(f'name = "x"\n[shape]\n{shape}\nheight = 2.6\n{FINISHES}')).frames


def box(length=5.0, width=4.0):
    return frames_of(f"length = {length}\nwidth = {width}")


def hard(frames, value=0.0):
    return {name: np.full(len(OCTAVES), value) for name in frames}


def reference(corners, source, receiver, order=2):
    """Positions of pyroomacoustics' visible image sources of an extruded polygon, but the source's own."""
    import pyroomacoustics as pra

    hard_wall = pra.Material(0.1)
    room = pra.Room.from_corners(
        np.array(corners, float).T, fs=16_000, max_order=order, materials=hard_wall
    )
    room.extrude(2.6, materials={"floor": hard_wall, "ceiling": hard_wall})
    room.add_source(list(source))
    room.add_microphone(list(receiver))
    room.image_source_model()
    seen = room.visibility[0][0].astype(bool)
    images, orders = room.sources[0].images.T, room.sources[0].orders
    return images[seen & (orders > 0)]


def unmatched(ours, theirs):
    """Images that only one of the two has; the reference works in single precision."""
    ours, theirs = np.asarray(ours, float), np.asarray(theirs, float)
    apart = np.linalg.norm(ours[:, None] - theirs[None], axis=-1)
    return int((apart.min(axis=1) > 2e-3).sum() + (apart.min(axis=0) > 2e-3).sum())


# No position lies on an axis of symmetry: there paths run exactly through corners, and rounding decides.
OFF = np.array([0.0123, 0.0217, 0.0311]), np.array([-0.0171, 0.0093, -0.0237])


def test_first_order_by_hand():
    """5 × 4 × 2.6 m, source (1, 1, 1.2), seat (4, 3, 1.2): the floor's image is (1, 1, −1.2)."""
    frames = box()
    found = {
        one.surfaces: one
        for one in reflections(frames, (1, 1, 1.2), (4, 3, 1.2), hard(frames), order=1)
    }
    assert set(found) == {(name,) for name in frames}
    floor = found[("floor",)]
    assert floor.image == pytest.approx([1, 1, -1.2])
    assert floor.points[0] == pytest.approx([2.5, 2.0, 0.0])
    way, direct = np.sqrt(9 + 4 + 5.76), np.sqrt(13)
    assert floor.delay == pytest.approx((way - direct) / C)
    assert floor.level_db == pytest.approx(np.full(8, 20 * np.log10(direct / way)))
    assert found[("left",)].image == pytest.approx([1, -1, 1.2])
    assert found[("front",)].points[0] == pytest.approx([0, 1 + 2 / 5, 1.2])


def test_absorption_weakens_a_reflection():
    """10 lg(1 − 0.9) = −10 dB a surface, by hand; then the early-reflection rule holds."""
    frames = box()
    strong = reflections(frames, (1, 1, 1.2), (3, 2, 1.2), hard(frames))
    weak = reflections(frames, (1, 1, 1.2), (3, 2, 1.2), hard(frames, 0.9))
    for one, other in zip(strong, weak, strict=True):
        assert other.level_db - one.level_db == pytest.approx(np.full(8, -10.0 * one.order))
    assert any(one.is_early_and_strong for one in strong)
    assert not any(one.is_early_and_strong for one in weak)


@settings(max_examples=40)
@given(
    st.tuples(st.floats(2.5, 8), st.floats(2.5, 6)),
    st.lists(st.floats(0.07, 0.93), min_size=6, max_size=6),
)
def test_rectangles_equal_the_reference(size, where):
    """Pyroomacoustics' image source model, up to second order: the same images, so the same delays."""
    length, width = size
    scale = np.array([length, width, 2.6])
    source, receiver = np.array(where[:3]) * scale + OFF[0], np.array(where[3:]) * scale + OFF[1]
    assume(np.linalg.norm(source - receiver) > 0.2)
    frames = box(length, width)
    ours = [one.image for one in reflections(frames, source, receiver, hard(frames))]
    theirs = reference([(0, 0), (length, 0), (length, width), (0, width)], source, receiver)
    assert unmatched(ours, theirs) == 0
    # 6 of first order, 18 of second: two chains across an edge share one image.
    assert len(theirs) >= 24


@settings(max_examples=40)
@given(
    st.lists(st.floats(0.06, 0.94), min_size=6, max_size=6), st.sampled_from(["l", "slanted", "t"])
)
def test_other_footprints_equal_the_reference(where, kind):
    """Non-convex and slanted plans: what cannot be seen is not there."""
    import shapely

    corners = {
        "l": [(0, 0), (6, 0), (6, 2.5), (4, 2.5), (4, 4), (0, 4)],
        "slanted": [(0, 0), (5.5, 0.6), (6, 3.4), (2.5, 4.2), (-0.4, 3.0)],
        "t": [(0, 0), (6, 0), (6, 2), (4, 2), (4, 4), (2, 4), (2, 2), (0, 2)],
    }[kind]
    plan = shapely.Polygon(corners)
    low_x, low_y, high_x, high_y = plan.bounds
    scale = np.array([high_x - low_x, high_y - low_y, 2.6])
    start = np.array([low_x, low_y, 0.0])
    source = start + np.array(where[:3]) * scale + OFF[0]
    receiver = start + np.array(where[3:]) * scale + OFF[1]
    inner = plan.buffer(-0.05)
    assume(
        inner.contains(shapely.Point(source[:2])) and inner.contains(shapely.Point(receiver[:2]))
    )
    assume(np.linalg.norm(source - receiver) > 0.2)
    frames = frames_of(f"footprint = {[list(c) for c in corners]}")
    ours = [one.image for one in reflections(frames, source, receiver, hard(frames))]
    theirs = reference(corners, source, receiver)
    # A path that grazes an inner corner may be seen by one of the two and not by the other.
    assert unmatched(ours, theirs) <= 1


def test_the_serving_area_holds_every_touch_point():
    frames = box()
    source, seat = np.array([1.0, 1.2, 1.2]), np.array([3.2, 2.0, 1.2])
    for name in ("left", "ceiling", "front"):
        area = serving_area(frames[name], source, seat)
        rng = np.random.default_rng(1)
        for _ in range(50):
            head = seat + rng.uniform(-0.3, 0.3, 3)
            image = mirrored(source, frames[name])
            share = ((image - frames[name].origin) @ frames[name].normal) / (
                (image - head) @ frames[name].normal
            )
            u, v = frames[name].to_surface(image + share * (head - image))
            assert area.left - 1e-9 <= u <= area.left + area.width + 1e-9
            assert area.bottom - 1e-9 <= v <= area.bottom + area.height + 1e-9
        assert area.width < 1.5


@given(st.lists(st.floats(0.1, 0.9), min_size=6, max_size=6))
def test_reciprocity(where):
    """Source and receiver exchanged: the same delays and levels."""
    scale = np.array([5.0, 4.0, 2.6])
    a, b = np.array(where[:3]) * scale + OFF[0] / 3, np.array(where[3:]) * scale + OFF[1] / 3
    assume(np.linalg.norm(a - b) > 0.2)
    frames = box()
    one, other = (
        reflections(frames, a, b, hard(frames, 0.3)),
        reflections(frames, b, a, hard(frames, 0.3)),
    )
    assert sorted(r.delay for r in one) == pytest.approx(sorted(r.delay for r in other), abs=1e-9)
