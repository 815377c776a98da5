"""A refusal says which file, where in it, what is wrong and what would be right."""

import pytest

from planner import errors


def test_the_parts_of_a_message_stand_in_order():
    refusal = errors.RoomError(
        "9.00 m is wider than the wall",
        file="/home/x/room.toml",
        where="[[opening]] 2",
        cure="Make it 3 m.",
    )
    assert str(refusal) == "room.toml, [[opening]] 2: 9.00 m is wider than the wall. Make it 3 m."
    assert str(errors.RoomError("what?")) == "what?"


@pytest.mark.parametrize(
    "kind",
    [
        errors.RoomError,
        errors.MaterialError,
        errors.CatalogueError,
        errors.OptionError,
        errors.RecordingError,
        errors.MeasuredError,
        errors.ProjectError,
    ],
)
def test_every_refusal_of_input_is_also_a_value_error(kind):
    assert issubclass(kind, errors.InputError)
    assert issubclass(kind, ValueError)
    assert kind.__name__ in errors.__doc__
