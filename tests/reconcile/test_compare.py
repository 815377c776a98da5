"""The comparison, against sums done by hand and slips made on purpose."""

import json
from types import SimpleNamespace

import numpy as np
import pytest

from planner.air import Air
from planner.bands import OCTAVES, THIRDS
from planner.reconcile import compare
from planner.reconcile.doubts import time_in_other_air, unit_slip
from planner.reconcile.octaves import octave_times

NAN = float("nan")


def prediction(eyring=0.50, sabine=0.56, u=0.04, **changes):
    values = {
        "bands_hz": OCTAVES,
        "methods": {"sabine": np.full(8, sabine), "eyring": np.full(8, eyring)},
        "u_s": np.full(8, u),
        "assumed_hz": (63,),
    }
    return SimpleNamespace(**(values | changes))


def measurement(t=0.53, u=0.03, bands=OCTAVES, state="empty", air=None):
    t = np.broadcast_to(np.asarray(t, float), len(bands)).copy()
    u = np.broadcast_to(np.asarray(u, float), len(bands)).copy()
    return SimpleNamespace(bands_hz=bands, t_s=t, u_s=u, state=state, air=air)


def test_difference_by_hand():
    """0.53 s against 0.50 s: +0.03 s, +6 %, and 0.03 / sqrt(0.04² + 0.03²) = 0.6 uncertainties."""
    result = compare(prediction(), measurement())
    assert result.difference_s == pytest.approx(np.full(8, 0.03))
    assert result.difference_percent == pytest.approx(np.full(8, 6.0))
    assert result.z == pytest.approx(np.full(8, 0.6))
    assert result.predicted_range == pytest.approx(np.array([[0.50] * 8, [0.56] * 8]))


@pytest.mark.parametrize(
    ("formula", "difference"), [("eyring", 0.03), ("sabine", -0.03), ("both", 0.03)]
)
def test_the_formula_of_the_target_is_the_one_compared(formula, difference):
    result = compare(prediction(), measurement(), formula=formula)
    assert result.difference_s[3] == pytest.approx(difference)
    assert result.formula in ("eyring", "sabine")


def test_a_missing_band_is_null_everywhere_and_nothing_else_is():
    result = compare(prediction(), measurement([NAN, *[0.5] * 7], [NAN, *[0.02] * 7]))
    content = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert content["bands_hz"] == [63, 125, 250, 500, 1000, 2000, 4000, 8000]
    for key in ("measured", "difference_s", "z"):
        assert content[key][0] is None
        assert None not in content[key][1:]
    assert None not in content["predicted"]
    assert content["calibrated"] == []
    assert any("63 Hz" in text and "no value" in text for text in content["words"])


def test_a_measurement_of_some_octaves_lands_on_the_right_ones():
    result = compare(prediction(), measurement([0.4, 0.6], 0.02, bands=(250, 1000)))
    assert result.measured[[2, 4]] == pytest.approx([0.4, 0.6])
    assert np.isnan(result.measured[[0, 1, 3, 5, 6, 7]]).all()


def test_thirds_are_joined_to_octaves():
    """Thirds of 0.4, 0.5 and 0.6 s with u = 0.03 s: mean 0.5 s; u² = 0.0003 + 0.1² / 3."""
    t = [0.4 + 0.1 * (number % 3) for number in range(len(THIRDS))]
    joined = octave_times(measurement(t, 0.03, bands=THIRDS))
    assert joined.t_s == pytest.approx(np.full(8, 0.5))
    assert joined.u_s == pytest.approx(np.full(8, np.sqrt(0.0003 + 0.01 / 3)))
    assert "one-third octaves" in joined.warnings[0]


def test_an_octave_with_a_third_missing_is_missing():
    t = np.full(len(THIRDS), 0.5)
    t[THIRDS.index(80)] = NAN
    joined = octave_times(measurement(t, 0.03, bands=THIRDS))
    assert np.isnan(joined.t_s[0])
    assert np.isfinite(joined.t_s[1:]).all()


def test_no_stated_uncertainty_is_taken_as_ten_percent_and_said():
    joined = octave_times(measurement(0.5, [NAN] * 4 + [0.02] * 4))
    assert joined.u_s == pytest.approx([0.05] * 4 + [0.02] * 4)
    assert "63, 125, 250, 500 Hz" in joined.warnings[0]


@pytest.mark.parametrize(
    ("factor", "words"),
    [(3.28, "metres while the file says feet"), (0.305, "feet while the file says metres")],
)
def test_a_room_in_the_wrong_unit_is_recognised(factor, words):
    """Both formulas scale with length; 1 ft = 0.3048 m, exactly."""
    wobble = np.array([1.1, 0.92, 1.05, 0.96, 1.0, 1.08, 0.9, 1.02])
    result = compare(prediction(), measurement(0.5 * factor * wobble))
    assert any(words in warning for warning in result.warnings)


def test_milliseconds_are_recognised():
    assert "milliseconds" in unit_slip(np.full(8, 0.5), np.full(8, 480.0))


@pytest.mark.parametrize("factor", [0.5, 0.7, 1.0, 1.6, 2.2])
def test_an_ordinary_difference_is_no_slip(factor):
    assert unit_slip(np.full(8, 0.5), np.full(8, 0.5 * factor)) is None


def test_another_state_is_warned_about():
    result = compare(prediction(), measurement(state="occupied"), state="empty")
    assert any("measured occupied but is described empty" in w for w in result.warnings)
    assert compare(prediction(), measurement(state="empty"), state="empty").warnings == ()


def test_a_dry_winter_day_is_warned_about_and_a_near_climate_is_not():
    room_air = Air(20.0, 60.0)
    dry = compare(prediction(1.0), measurement(1.0, air=Air(20.0, 15.0)), air=room_air)
    assert any("15 %" in warning and "8k Hz" in warning for warning in dry.warnings)
    near = compare(prediction(1.0), measurement(1.0, air=Air(20.5, 58.0)), air=room_air)
    assert near.warnings == ()


def test_the_time_in_other_air_by_hand():
    """ISO 9613-2:1996, table 2, at 8 kHz: 76.6 dB/km at 20 °C and 70 %, 202 dB/km at 15 °C and 20 %.

    m = 0.0766 / 4.343 = 0.01764 /m and 0.202 / 4.343 = 0.04651 /m; the two
    temperatures give c = 343.20 and 340.26 m/s (ISO 9613-1, A.5). With T = 0.80 s at first:
    1/T' = (1/0.80 − 4·0.01764·343.20/55.262)·340.26/343.20 + 4·0.04651·340.26/55.262 = 1.9504.
    """
    here, there = Air(20.0, 70.0), Air(15.0, 20.0)
    changed = time_in_other_air(np.full(8, 0.80), here, there)
    assert changed[7] == pytest.approx(1 / 1.9504, rel=0.005)


def test_words_tell_longer_from_shorter():
    t = np.array([0.5, 0.9, 0.9, 0.5, 0.5, 0.5, 0.2, 0.2])
    words = compare(prediction(), measurement(t)).words
    assert any("longer than predicted at 125, 250 Hz" in text for text in words)
    assert any("shorter than predicted at 4k, 8k Hz" in text for text in words)


def test_bad_bands_of_a_measurement_are_not_read_as_zero():
    """A time of zero or less is no time."""
    assert np.isnan(octave_times(measurement([0.0, -1.0, *[0.5] * 6])).t_s[:2]).all()
