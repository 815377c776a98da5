"""measured.csv: written, read back, mangled by spreadsheets, and refused where it cannot be right."""

import json

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.air import Air
from planner.errors import MeasuredError
from planner.measure.figures import doubts_in_words
from planner.measure.measured import (
    Measured,
    measured_from_bytes,
    measured_to_csv,
    read_measured,
    write_measured,
)

GOOD = """# Reverberation times by interrupted noise
# state: empty
# date: 2026-05-04
# temperature_c: 21
# humidity_percent: 45
band_hz,t_s,u_s,evaluation,t20_s,t30_s,edt_s,range_db,positions,decays,flags
125,0.55,0.03,whole-decay,0.54,,0.50,39.5,6,12,bent; few-decays
250,,,,,,,18.0,0,0,refused: range 18 dB
500,0.41,0.01,t30,0.40,0.41,0.39,52.0,6,12,
"""


def read(text):
    return measured_from_bytes(text.encode(), "measured.csv")


def test_a_file_is_read():
    found = read(GOOD)
    assert found.bands_hz == (125, 250, 500)
    assert found.t_s[0] == 0.55
    assert np.isnan(found.t_s[1])
    assert found.evaluation == ("whole-decay", "", "t30")
    assert found.flags[0] == ("bent", "few-decays")
    assert found.state == "empty"
    assert found.air == Air(21, 45, 101.325)
    content = json.loads(json.dumps(found.to_json(), allow_nan=False))
    assert content["t_s"] == [0.55, None, 0.41]
    assert content["used"] == ["whole-decay", None, "t30"]


def test_what_is_written_is_read_back(tmp_path):
    found = read(GOOD)
    again = read_measured(write_measured(tmp_path / "m.csv", found))
    assert again.bands_hz == found.bands_hz
    assert np.array_equal(again.t_s, found.t_s, equal_nan=True)
    assert again.flags == found.flags
    assert (again.state, again.air, again.date) == (found.state, found.air, found.date)


@given(st.lists(st.one_of(st.just(float("nan")), st.floats(0.05, 20)), min_size=8, max_size=8))
def test_round_trip_keeps_four_decimals(times):
    t = np.array(times)
    nan = np.full(8, np.nan)
    one = Measured(
        (63, 125, 250, 500, 1000, 2000, 4000, 8000), t, nan, ("",) * 8, nan, nan, nan, nan, (1,) * 8, (2,) * 8,
        ((),) * 8, program="x",
    )  # fmt: skip
    again = read(measured_to_csv(one))
    assert again.t_s == pytest.approx(t, abs=5.1e-5, nan_ok=True)


def test_a_spreadsheet_with_semicolons_and_decimal_commas():
    text = (
        GOOD.replace(",", ";")
        .replace("0.", "0,")
        .replace("39.5", "39,5")
        .replace("52.0", "52,0")
        .replace("18.0", "18,0")
    )
    found = read("\ufeff" + text)
    assert found.t_s[2] == 0.41
    assert found.state == "empty"


def test_two_columns_are_enough():
    found = read("band_hz,t_s\n500,0.4\n1k,0.5\n".replace("1k", "1000"))
    assert found.t_s.tolist() == [0.4, 0.5]
    assert found.air is None


@pytest.mark.parametrize(
    ("there", "instead", "words"),
    [
        ("0.55,0.03", "fast,0.03", "not a number"),
        ("0.55,0.03", "550,0.03", "milliseconds"),
        ("0.55,0.03", "-0.5,0.03", "cannot be"),
        ("0.55,0.03", "nan,0.03", "not a number"),
        ("0.55,0.03", "inf,0.03", "cannot be"),
        ("500,0.41", "100,0.41", "Sort the bands"),
        ("500,0.41", ",0.41", "is empty"),
        ("500,0.41", "x,0.41", "not a number"),
        ("whole-decay", "guessed", "no evaluation"),
        ("band_hz", "band", "no column 'band_hz'"),
        ("t_s,u_s", "t,u_s", "no column 't_s'"),
        ("state: empty", "state: haunted", "no state"),
        ("temperature_c: 21", "temperature_c: warm", "temperature_c"),
        ("temperature_c: 21", "temperature_c: 99", "cannot be"),
        ("39.5", "900", "cannot be"),
    ],
)  # fmt: skip
def test_malformed_files_are_refused_with_the_place(there, instead, words):
    assert there in GOOD
    with pytest.raises(MeasuredError, match=words) as refusal:
        read(GOOD.replace(there, instead, 1))
    assert str(refusal.value).startswith("measured.csv")


@pytest.mark.parametrize(
    "raw", [b"", b"\x00\x01\x02", b"#", b"\xff\xfe", b"RIFF....WAVE", b'"' * 1000, b"a" * 3_000_000]
)
def test_what_is_no_table_is_refused(raw):
    with pytest.raises(MeasuredError):
        measured_from_bytes(raw, "measured.csv")


@given(st.binary(max_size=300))
def test_any_bytes_are_a_table_or_one_message(raw):
    try:
        measured_from_bytes(raw, "measured.csv")
    except MeasuredError as refusal:
        assert "measured.csv" in str(refusal)  # noqa: PT017 - either outcome is right


def test_doubts_are_words_with_a_cure():
    said = doubts_in_words((63, 125, 250), (("short-range",), ("short-range", "mains hum"), ()))
    assert said == (
        "63, 125 Hz: less than 35 dB above the noise: play louder or find a quieter hour.",
        "125 Hz: mains hum.",
    )
