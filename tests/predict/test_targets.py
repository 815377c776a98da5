"""Recommended times against the numbers of their sources."""

import numpy as np
import pytest

from planner.bands import OCTAVES
from planner.errors import RoomError
from planner.predict.targets import USES, own_limits, target_limits, target_of
from planner.room.files import parse_room

ROOM = (
    'name = "x"\n[shape]\nlength = 5.2\nwidth = 3.9\nheight = 2.6\n[surfaces]\nfloor = "concrete-floor"\n'
    'ceiling = "plasterboard-on-joists"\nwalls = "brick-painted"\n'
)


def at(limits, hz):
    return limits[OCTAVES.index(hz)]


@pytest.mark.parametrize(("volume", "mean"), [(30, 0.167), (60, 0.211), (120, 0.266)])
def test_listening_rooms_follow_the_volume(volume, mean):
    """T_m = 0.25 (V/100)^(1/3) (EBU Tech 3276, ITU-R BS.1116): 30, 60, 120 m³ → 0.167, 0.211, 0.266 s."""
    target = target_limits("control-room-bs1116", volume)
    assert at(target.aim, 1000) == pytest.approx(mean, abs=5e-4)
    for hz in (250, 500, 1000, 2000, 4000):
        assert at(target.high, hz) - at(target.low, hz) == pytest.approx(0.10)
    assert at(target.high, 63) - mean == pytest.approx(0.30, abs=1e-3)  # from memory
    assert at(target.high, 8000) - mean == pytest.approx(0.10, abs=1e-3)  # from memory


def test_ebu_keeps_the_time_between_two_limits():
    """EBU Tech 3276: 0.2 < T_m < 0.4 s; a 30 m³ room falls under the lower clamp."""
    assert at(target_limits("listening-room-ebu3276", 30).aim, 1000) == pytest.approx(0.2)
    assert at(target_limits("listening-room-ebu3276", 600).aim, 1000) == pytest.approx(0.4)


@pytest.mark.parametrize(
    ("use", "volume", "seconds"),
    [
        ("teaching-din18041-a3", 180, 0.55),  # 0.32 lg 180 − 0.17 = 0.552, a public check value
        ("music-din18041-a1", 100, 0.97),  # 0.45 · 2 + 0.07
        ("speech-din18041-a2", 1000, 0.97),  # 0.37 · 3 − 0.14
        ("inclusive-din18041-a4", 100, 0.38),  # 0.26 · 2 − 0.14
        ("sport-din18041-a5", 10_000, 2.00),  # 0.75 · 4 − 1.00
    ],
)
def test_din_18041_by_hand(use, volume, seconds):
    """DIN 18041:2016-03, group A, to the two decimals of the standard."""
    target = target_limits(use, volume)
    assert at(target.aim, 1000) == pytest.approx(seconds, abs=1e-9)
    assert at(target.low, 1000) == pytest.approx(0.8 * seconds)
    assert at(target.high, 1000) == pytest.approx(1.2 * seconds)
    assert np.isnan(at(target.high, 63))  # guidance only


@pytest.mark.parametrize(("volume", "seconds"), [(200, 0.6), (400, 0.7)])
def test_classrooms_of_s1260(volume, seconds):
    """ANSI/ASA S12.60: 0.6 s up to 10 000 ft³ (283 m³), 0.7 s up to 20 000 ft³; no lower limit."""
    target = target_limits("classroom-s1260", volume)
    assert [at(target.high, hz) for hz in (500, 1000, 2000)] == pytest.approx([seconds] * 3)
    assert np.isnan(target.low).all()
    assert np.isnan(at(target.high, 250))


@pytest.mark.parametrize("use", [use.id for use in USES])
def test_every_use_says_where_it_comes_from(use):
    target = target_limits(use, 60)
    assert target.source
    assert target.basis
    assert target.judged.any()
    both = np.isfinite(target.low) & np.isfinite(target.high)
    assert np.all(target.low[both] < target.high[both])


def test_a_volume_outside_the_source_is_a_warning():
    assert any("meant for" in text for text in target_limits("voice-room", 200).warnings)


def test_an_unknown_use_is_refused_with_the_nearest():
    with pytest.raises(RoomError, match="control-room-bs1116"):
        target_limits("control-room-bs1117", 60)


def test_own_limits_replace_those_of_a_use_in_their_bands():
    room = parse_room(ROOM + '[target]\nuse = "control-room-bs1116"\nhigh = { 63 = 0.9 }\n')
    target = target_of(room, 52.7)
    assert at(target.high, 63) == 0.9
    assert at(target.high, 1000) == pytest.approx(0.252, abs=5e-4)
    assert target_of(parse_room(ROOM), 52.7) is None
    own = own_limits({}, {125: 0.5})
    assert np.isnan(own.low).all()
    assert at(own.high, 125) == 0.5
    with pytest.raises(RoomError, match="limits are"):
        target_of(
            parse_room(ROOM + '[target]\nuse = "control-room-bs1116"\nlow = { 1000 = 0.9 }\n'), 52.7
        )
