"""Surfaces in pieces: they cover each surface once, face inwards, and change no uniform room."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.predict.simulation import simulate_room
from planner.predict.tiles import described_places, tiles
from planner.room.files import parse_room
from planner.room.geometry import geometry
from planner.room.surfaces import room_surfaces

BANDS = (63, 125, 250, 500, 1000, 2000, 4000, 8000)
OWN = "".join(
    f'[[material]]\nid = "{name}"\nalpha = {{ {", ".join(f"{hz} = {a}" for hz in BANDS)} }}\n'
    for name, a in (("u", 0.15), ("soft", 0.9))
)
BOX = "length = 5.2\nwidth = 3.9\nheight = 2.6\n"
ELL = "footprint = [[0,0],[6,0],[6,2.5],[4,2.5],[4,4],[0,4]]\nheight = 2.6\n"


def described(shape, wall, material="u"):
    return parse_room(
        f'name = "x"\n[shape]\n{shape}[surfaces]\nfloor = "u"\nceiling = "u"\nwalls = "u"\n'
        f'[[opening]]\nwall = "{wall}"\nkind = "door"\nmaterial = "{material}"\nleft = 1.0\nbottom = 0\n'
        "width = 0.9\nheight = 2.1\n"
        f'[[patch]]\non = "ceiling"\nmaterial = "{material}"\nleft = 0.4\nbottom = 0.5\nwidth = 3.0\n'
        f'height = 1.2\n[[patch]]\non = "floor"\nmaterial = "{material}"\narea = 4.0\n' + OWN
    )


def area_and_normal(corners):
    """By cross products from the first corner, written out here."""
    spans = corners[1:] - corners[0]
    across = 0.5 * np.cross(spans[:-1], spans[1:]).sum(axis=0)
    size = np.linalg.norm(across)
    return size, across / size


@pytest.mark.parametrize(("shape", "wall"), [(BOX, "left"), (ELL, "wall-1")])
def test_each_surface_is_covered_once_and_faces_into_the_room(shape, wall):
    room = described(shape, wall)
    surfaces = room_surfaces(room)
    found = tiles(room, surfaces, described_places(room))
    shapes = geometry(room)
    for name, gross in shapes.areas.items():
        mine = [area_and_normal(tile.corners) for tile in found if tile.surface == name]
        assert sum(size for size, _ in mine) == pytest.approx(gross, abs=1e-4)
        for _, normal in mine:
            assert normal == pytest.approx(shapes.frames[name].normal, abs=1e-9)
    # Absorption area is what the parts add up to: nothing is lost by cutting.
    total = sum(area_and_normal(tile.corners)[0] * tile.alpha for tile in found)
    assert total == pytest.approx(surfaces.area @ surfaces.alpha, rel=1e-4)


def test_a_door_lies_where_it_was_drawn():
    """The left wall of a room is seen from inside: a door 1 m from its left end, by hand."""
    room = described(BOX, "left", "soft")
    found = tiles(room, room_surfaces(room), described_places(room))
    door = [t for t in found if t.surface == "left" and t.alpha[0] > 0.8]
    assert len(door) == 1
    frame = geometry(room).frames["left"]
    along = frame.to_surface(door[0].corners)
    assert along.min(axis=0) == pytest.approx([1.0, 0.0])
    assert along.max(axis=0) == pytest.approx([1.9, 2.1])


def test_a_part_whose_places_do_not_make_up_its_area_is_averaged():
    room = described(BOX, "left", "soft")
    surfaces = room_surfaces(room)
    places = described_places(room)
    number = min(places)
    found = tiles(room, surfaces, {**places, number: [(1.0, 0.0, 0.9, 1.0)]})
    values = {round(float(tile.alpha[0]), 4) for tile in found if tile.surface == "left"}
    mean = (0.9 * 0.9 * 2.1 + 0.15 * (5.2 * 2.6 - 0.9 * 2.1)) / (5.2 * 2.6)
    assert values == {round(mean, 4)}


rectangles = st.lists(
    st.tuples(st.floats(0, 4.0), st.floats(0, 1.8), st.floats(0.1, 1.2), st.floats(0.1, 0.8)),
    max_size=6,
)


@settings(max_examples=100)
@given(rectangles)
def test_whatever_lies_on_a_wall_the_pieces_make_up_the_wall(drawn):
    """Random rectangles as patches of their own area; those that overlap count as unplaced."""
    text = "".join(
        f'[[patch]]\non = "left"\nmaterial = "soft"\narea = {w * h}\n' for _, _, w, h in drawn
    )
    room = parse_room(
        f'name = "x"\n[shape]\n{BOX}[surfaces]\nfloor = "u"\nceiling = "u"\nwalls = "u"\n{text}{OWN}'
    )
    surfaces = room_surfaces(room)
    first = len(room.surface_materials)
    found = tiles(room, surfaces, {first + n: [each] for n, each in enumerate(drawn)})
    mine = [(area_and_normal(t.corners)[0], t.alpha[0]) for t in found if t.surface == "left"]
    assert sum(size for size, _ in mine) == pytest.approx(5.2 * 2.6, abs=1e-4)


def test_cutting_a_uniform_room_changes_nothing_but_chance():
    """Same coefficient everywhere: with and without cuts the traced time is one, within 3 %."""
    cut = described(BOX, "left")
    whole = parse_room(
        f'name = "x"\n[shape]\n{BOX}[surfaces]\nfloor = "u"\nceiling = "u"\nwalls = "u"\n{OWN}'
    )
    times = [
        simulate_room(one, room_surfaces(one), one.air_state(), rays=3000).reverberation_time
        for one in (cut, whole)
    ]
    assert times[0] == pytest.approx(times[1], rel=0.03)
