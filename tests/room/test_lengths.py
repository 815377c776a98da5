"""Lengths as people write them. Foot and inch: 0.3048 m and 0.0254 m exactly (ISO 80000-3)."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.errors import RoomError
from planner.room.lengths import feet_and_inches, parse_length, shown_length


@pytest.mark.parametrize(
    ("text", "metres"),
    [
        (3.75, 3.75),
        ("3.75", 3.75),
        ("3,75 m", 3.75),
        ("375 cm", 3.75),
        ("3750mm", 3.75),
        ("12' 6 1/2\"", 12 * 0.3048 + 6.5 * 0.0254),
        ("12ft6", 12 * 0.3048 + 6 * 0.0254),
        ("12'6", 12 * 0.3048 + 6 * 0.0254),
        ("12 ft", 12 * 0.3048),
        ("12′ 6″", 12 * 0.3048 + 6 * 0.0254),
        ("78 in", 78 * 0.0254),
        ("6 1/2 in", 6.5 * 0.0254),
        ("-2 m", -2.0),
        (".5 m", 0.5),
    ],
)
def test_lengths_with_and_without_units(text, metres):
    assert parse_length(text) == pytest.approx(metres, abs=1e-12)


def test_bare_numbers_are_in_the_files_unit():
    assert parse_length(10, "ft") == pytest.approx(3.048)
    assert parse_length("10", "ft") == pytest.approx(3.048)
    assert parse_length("3 m", "ft") == 3.0


@pytest.mark.parametrize(
    "text", ["abc", "", "12 13", "m", "1e5", "' \"", "1/0", "2.6 apples", True, None, [1]]
)
def test_what_is_no_length_is_refused(text):
    with pytest.raises(RoomError, match="is not a length"):
        parse_length(text)


@given(st.integers(0, 8 * 12 * 60))
def test_feet_and_inches_read_back(eighths):
    length = eighths * 0.0254 / 8
    assert parse_length(feet_and_inches(length)) == pytest.approx(length, abs=1e-9)


def test_lengths_are_shown_with_their_unit():
    assert shown_length(3.7501) == "3.75 m"
    assert shown_length(3.8227, "ft") == "12' 6 1/2\""
