"""Modes as functions of place: elements against cosines, and where a wall is pressed on."""

import numpy as np
import pytest

from planner.air import Air
from planner.predict.mode_field import mode_field, wall_pressure
from planner.predict.seat import seat
from planner.room.files import parse_room
from planner.room.geometry import geometry
from planner.room.surfaces import room_surfaces

C = 343.0
REST = (
    '[surfaces]\nfloor = "carpet-on-underlay"\nceiling = "plasterboard-on-joists"\n'
    'walls = "plasterboard-on-studs"\n'
    "[positions]\nseat = [3.3, 1.7, 1.2]\nloudspeakers = [[1.0, 1.1, 1.2], [0.9, 2.6, 1.1]]\n"
)
BOX = f'name = "x"\n[shape]\nlength = 5.3\nwidth = 3.7\nheight = 2.5\n{REST}'
CORNERS = (
    'name = "x"\n[shape]\nfootprint = [[0, 0], [5.3, 0], [5.3, 3.7], [0, 3.7]]\nheight = 2.5\n'
    + REST
)
ELL = (
    'name = "x"\n[shape]\nfootprint = [[0, 0], [6, 0], [6, 2], [2, 2], [2, 5], [0, 5]]\nheight = 2.5\n'
    '[surfaces]\nfloor = "carpet-on-underlay"\nceiling = "plasterboard-on-joists"\n'
    'walls = "plasterboard-on-studs"\n'
    "[positions]\nseat = [4.3, 1.1, 1.2]\nloudspeakers = [[1.0, 1.1, 1.2]]\n"
)


def fields(text, highest):
    room = parse_room(text)
    return room, mode_field(room, room_surfaces(room), C, highest)


def test_the_first_mode_presses_on_the_ends_and_not_on_the_middle_of_a_side():
    """Textbook: p² = 2 cos²(π x / L) of one mode alone, 2 on the end walls, 0 half way along."""
    room, field = fields(BOX, 40.0)  # 32.4 Hz along 5.3 m; the next is 46.4 Hz
    frames = geometry(room).frames
    assert wall_pressure(field, frames["front"], 30, 40) == pytest.approx(2.0)
    side = wall_pressure(field, frames["left"], 30, 40)
    u = (np.arange(side.shape[1]) + 0.5) * 5.3 / side.shape[1]
    assert side[0] == pytest.approx(2.0 * np.cos(np.pi * u / 5.3) ** 2, abs=1e-9)
    assert wall_pressure(field, frames["left"], 34, 40) == pytest.approx(0.0)  # there is none


def test_elements_press_as_the_closed_form_does():
    """The same walls as four corners: mean over all modes up to 177 Hz, within 3 % of the largest."""
    (box, closed), (drawn, elements) = fields(BOX, 177.0), fields(CORNERS, 177.0)
    assert elements.modes.hz == pytest.approx(closed.modes.hz, rel=2e-3, abs=1e-6)
    # Walls in the order of the edges from the origin: y = 0, x = L, y = W, x = 0.
    pairs = zip(("left", "back", "right", "front"), drawn.wall_names, strict=True)
    by_place = {}
    for name in box.wall_names:
        frame = geometry(box).frames[name]
        by_place[tuple(np.round(frame.origin, 6))] = wall_pressure(closed, frame, 44, 177)
    for _, name in pairs:
        frame = geometry(drawn).frames[name]
        found = wall_pressure(elements, frame, 44, 177)
        true = by_place[tuple(np.round(frame.origin, 6))]
        assert np.abs(found - true).max() < 0.03 * true.max()


def test_the_response_of_four_corners_is_that_of_the_rectangle():
    """Finite elements in plan against products of cosines, which share nothing but the sum."""
    rooms = [parse_room(text) for text in (BOX, CORNERS)]
    box, drawn = (seat(one, room_surfaces(one), Air(), 75.0) for one in rooms)
    for mine, true in zip(drawn.responses, box.responses, strict=True):
        away = true.level_db > true.level_db.max() - 25.0  # in a deep dip rounding is all there is
        assert np.abs(mine.level_db - true.level_db)[away].max() < 0.3


def test_shapes_in_an_ell_have_mean_square_one():
    """Over random points of the room (Monte Carlo, so within a few standard errors)."""
    _, field = fields(ELL, 90.0)
    points = np.random.default_rng(4).uniform((0, 0, 0), (6, 5, 2.5), (30_000, 3))
    inside = (points[:, 1] < 2) | (points[:, 0] < 2)
    square = field.shape_at(points[inside]) ** 2
    error = square.std(axis=0) / np.sqrt(inside.sum())
    assert np.abs(square.mean(axis=0) - 1.0).max() < max(5 * error.max(), 0.02)


def test_an_ell_has_a_response_and_reciprocity():
    room, field = fields(ELL, 120.0)
    one, other = np.array([4.3, 1.1, 1.2]), np.array([1.0, 4.1, 0.4])
    product = field.shape_at(one) * field.shape_at(other)
    assert product == pytest.approx(field.shape_at(np.stack([other, one])).prod(axis=0))
    found = seat(room, room_surfaces(room), Air(), 250.0)
    assert found.responses[0].hz[-1] == pytest.approx(300.0)
    assert np.ptp(found.responses[0].level_db) > 10.0
    assert "ends at 300 Hz" in " ".join(found.warnings)
