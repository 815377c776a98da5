"""Which file is which position, what the average is, and which grade is reached."""

import numpy as np
import pytest

from planner.errors import RecordingError
from planner.measure.survey import (
    distance_doubts,
    grade,
    iso_uncertainty,
    place_by_name,
    read_survey,
)


def write(path, text):
    path.write_text(text, encoding="utf-8")
    return path


def test_a_survey_is_read(tmp_path):
    path = write(
        tmp_path / "survey.csv",
        "file,source_position,microphone_position,state,kind,note\na.wav,A,1,empty,interrupted,\nb.wav,A,2,,impulse,x\n",
    )
    places = read_survey(path)
    assert places["a.wav"].pair == ("A", "1")
    assert places["a.wav"].state == "empty"
    assert places["b.wav"].kind == "impulse"


@pytest.mark.parametrize(
    ("row", "words"),
    [
        ("a.wav,A,1,haunted,,", "'haunted' is not known"),
        ("a.wav,A,1,,clap,", "'clap' is not known"),
        ("../a.wav,A,1,,,", "no file name"),
        (",A,1,,,", "no file name"),
        ("a.wav,,1,,,", "position is empty"),
        ("a.wav,A,1,,,\na.wav,A,2,,,", "listed twice"),
    ],
)
def test_a_wrong_survey_is_refused_with_the_line(tmp_path, row, words):
    path = write(
        tmp_path / "survey.csv",
        "file,source_position,microphone_position,state,kind,note\n" + row + "\n",
    )
    with pytest.raises(RecordingError, match=words) as refusal:
        read_survey(path)
    assert "survey.csv, line" in str(refusal.value)


@pytest.mark.parametrize(
    ("name", "pair"),
    [
        ("A2.wav", ("A", "2")),
        ("b-3.flac", ("B", "3")),
        ("s1_m4.wav", ("1", "4")),
        ("kitchen.wav", ("1", "kitchen")),
    ],
)
def test_file_names_say_which_position(name, pair):
    assert place_by_name(name).pair == pair


def test_grades():
    """ISO 3382-2:2008, table 1 (from memory): 2 / 6 / 12 pairs, 1 / 2 / 3 decays per pair."""
    six = [(s, m) for s in "AB" for m in "123"]
    assert grade(six, 2)[0] == "engineering"
    assert "12 pairs" in grade(six, 2)[1]
    assert grade(six, 1)[0] == "survey"
    assert "2 decays per pair" in grade(six, 1)[1]
    assert grade([("A", "1")], 4)[0] == ""
    assert grade([(s, m) for s in "ABC" for m in "1234"], 3) == ("precision", "")


def test_the_uncertainty_formula_of_the_standard():
    """ISO 3382-2:2008, annex A (from memory): T = 0.3 s, 6 positions, 2 decays: T20 9.7 % at 125 Hz, 3.4 % at 1 kHz, B = 0.71 f."""
    for hz, percent in ((125, 9.7), (1000, 3.4)):
        u = iso_uncertainty(
            np.array([0.3]), np.array([0.71 * hz]), np.array([6.0]), np.array([2.0]), "t20"
        )
        assert 100 * u[0] / 0.3 == pytest.approx(percent, abs=0.06)


def test_positions_that_stand_too_close():
    """d_min = 2 sqrt(60/(343 · 0.3)) = 1.53 m by hand (ISO 3382-1)."""
    doubts = distance_doubts(
        {"A": (1, 1, 1.5)}, {"1": (2, 1, 1.2), "2": (2.5, 1, 1.2), "3": (4, 3, 1.2)},
        [("A", "1"), ("A", "2"), ("A", "3"), ("B", "3")], volume=60.0, reverberation_time=0.3,
    )  # fmt: skip
    text = " ".join(doubts)
    assert "Source A and microphone 1 stand 1.04 m apart, 1.53 m are wanted" in text
    assert "microphone 3 stand" not in text
    assert "Microphones 1 and 2 stand 0.50 m apart" in text
    assert "Source B is not among" in text
