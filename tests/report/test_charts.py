"""Charts: the numbers drawn are the numbers given, and the conventions of band charts hold."""

import functools
import json
import math
import types

import numpy as np
import pytest

from planner.report import charts
from planner.report.chart import MOST_ROWS
from planner.report.charts import DARK, LIGHT, STYLES, DecayCurve, Series

BANDS = (63, 125, 250, 500, 1000, 2000, 4000, 8000)
TARGET = types.SimpleNamespace(
    name="invented steps",
    low=np.array([np.nan, 0.2, 0.2, 0.2, 0.2, 0.2, 0.2, 0.15]),
    high=np.array([0.5, 0.45, 0.35, 0.3, 0.3, 0.3, 0.3, np.nan]),
)
NOW = Series(
    "Untreated",
    [0.9, 0.85, 0.7, 0.62, 0.6, 0.55, 0.5, 0.4],
    "untreated",
    [0.7, 0.7, 0.6, 0.5, 0.5, 0.5, 0.4, 0.3],
    [1.1, 1.0, 0.8, 0.7, 0.7, 0.6, 0.6, 0.5],
    "80 % interval",
    [63],
)
AFTER = Series("Option A", [0.6, 0.42, 0.3, 0.27, 0.27, 0.27, 0.25, 0.2], "option-a")
MEASURED = Series("Measured", [np.nan, 0.8, 0.75, 0.6, 0.58, 0.5, 0.5, 0.42], "measured")
HOSTILE = "</script><b>&\"' =1+1 datum.x {{x}} #panic()"


def rows_of(spec):
    """All rows of all layers, however deep."""
    rows = list(spec.get("data", {}).get("values", []))
    for layer in spec.get("layer", []):
        rows += rows_of(layer)
    return rows


@functools.cache
def all_charts():
    """Made once: the list is read by every case below."""
    return tuple(every_chart())


def every_chart():
    time = np.arange(0, 2, 0.0005)
    hz = np.linspace(30, 300, 3000)
    grid = np.abs(np.cos(np.linspace(0, 3, 60)))[None, :] * np.ones((40, 1))
    yield charts.reverberation([NOW, AFTER, MEASURED], TARGET)
    yield charts.measured_against_predicted(NOW, MEASURED, TARGET)
    yield charts.absorption([Series("50 mm", [np.nan, 0.2, 0.7, 1.05, 1.1, 1, 0.95, 0.9])])
    yield charts.decay(DecayCurve(time, -60 * time, (-5, -25), -60.0, 0.0, -50.0, "T20"))
    yield charts.decay(DecayCurve(time, -60 * time))
    yield charts.modes(hz, ["axial", "tangential", "oblique"] * 1000, ["1 0 0"] * 3000)
    yield charts.modes([], [], [])
    yield charts.mode_count([50, 63, 80, 100], [1, 3, 2, 4])
    yield charts.response(hz, [("now", np.sin(hz)), ("moved", np.cos(hz))])
    yield charts.mode_pressure(
        np.linspace(0.05, 5.15, 60),
        np.linspace(0.05, 3.85, 40),
        grid,
        outline=[(0, 0), (5.2, 0), (5.2, 3.9), (0, 3.9)],
        seat=(3, 2, 1.2),
        loudspeakers=[(1, 1, 1.2)],
    )
    yield charts.front([0, 400, 900], [0.4, 0.2, 0.0], currency="EUR", chosen=2)
    yield from charts.side_by_side([AFTER, MEASURED], TARGET, untreated=NOW)


@pytest.mark.parametrize("number", range(13))
def test_every_chart_is_valid_small_and_says_what_it_shows(number):
    """Altair's own schema accepts it; strict JSON has no NaN; a sentence and a table come along."""
    chart = all_charts()[number]
    chart.altair(DARK)
    json.dumps(chart.vega_lite(LIGHT), allow_nan=False)
    assert len(rows_of(chart.spec)) <= MOST_ROWS
    assert chart.description.endswith(".")
    assert chart.spec["description"] == chart.description
    assert len(chart.table().columns) >= 2


def test_points_are_the_values_given_and_a_missing_band_is_a_gap():
    rows = rows_of(charts.reverberation([NOW, MEASURED], TARGET).spec)
    drawn = {(row["series"], row["band"]): row for row in rows if "series" in row}
    assert drawn["Measured", 63]["value"] is None
    for name, values in (("Untreated", NOW.values), ("Measured", MEASURED.values)):
        for hz, value in zip(BANDS, values, strict=True):
            if math.isfinite(value):
                assert drawn[name, hz]["value"] == pytest.approx(value, abs=1e-9)
    assert drawn["Untreated", 63]["assumed"]
    assert not drawn["Untreated", 125]["assumed"]
    assert (drawn["Untreated", 500]["low"], drawn["Untreated", 500]["high"]) == (0.5, 0.7)


def test_target_is_one_step_per_band_half_an_octave_to_each_side():
    """A band reaches from f/√2 to f·√2; a band without limits has no step."""
    rows = rows_of(charts.reverberation([NOW], TARGET).spec)
    steps = {round(math.sqrt(r["from"] * r["to"])): r for r in rows if "from" in r}
    assert set(steps) == set(BANDS)
    for step in steps.values():
        assert step["to"] / step["from"] == pytest.approx(2.0, abs=1e-3)
    assert (steps[125]["low"], steps[125]["high"]) == (0.2, 0.45)
    assert (steps[63]["low"], steps[63]["bottom"]) == (None, 0.0)
    assert steps[8000]["high"] is None


def test_frequency_axis_has_its_ticks_at_the_nominal_midbands_and_time_starts_at_zero():
    chart = charts.reverberation([NOW])
    line = chart.spec["layer"][0]["layer"][1]["encoding"]
    assert line["x"]["scale"]["base"] == 2
    assert tuple(line["x"]["axis"]["values"]) == BANDS
    assert line["x"]["scale"]["domain"] == pytest.approx([63 / 2**0.5, 8000 * 2**0.5])
    assert line["y"]["scale"]["domain"][0] == 0
    assert line["y"]["scale"]["domain"][1] >= 1.1


def test_message_names_the_bands_that_miss_and_by_how_much():
    """0.42 s and the rest lie inside; 63 Hz has 0.60 s against 0.50 s."""
    words = charts.target_sentence(AFTER, TARGET)
    assert "0.10 s too long at 63 Hz" in words
    assert "inside the target at 125 Hz" in words
    short = charts.target_sentence(Series("B", [0.4] * 4 + [0.17] + [0.25] * 3), TARGET)
    assert "0.03 s too short at 1000 Hz" in short
    assert "0.05 s too long at 250 Hz" in short
    assert "assumed at 63 Hz" in charts.target_sentence(NOW, TARGET)
    assert "no value at 63 Hz" in charts.target_sentence(MEASURED, TARGET)


def test_measured_against_predicted_names_the_largest_difference():
    """|0.75 − 0.70| = 0.05, |0.80 − 0.85| = 0.05, 8 kHz 0.02: the first of the two largest."""
    chart = charts.measured_against_predicted(NOW, MEASURED)
    assert "0.05 s" in chart.description.split(".  ")[0]
    difference = chart.table()["difference (s)"].to_numpy(copy=True)
    assert difference[2] == pytest.approx(0.05)
    assert np.isnan(difference[0])


def test_options_side_by_side_share_their_axes():
    small = charts.side_by_side([AFTER, MEASURED], TARGET, untreated=NOW)
    domains = {
        tuple(layer["encoding"]["y"]["scale"]["domain"])
        for chart in small
        for layer in chart.spec["layer"][-1]["layer"][1:2]
    }
    assert len(small) == 2
    assert len(domains) == 1


def test_a_chart_holds_at_most_four_series_each_with_its_own_look():
    with pytest.raises(ValueError, match="1 to 4 series"):
        charts.reverberation([])
    with pytest.raises(ValueError, match="look of its own"):
        charts.reverberation([NOW, Series("Other", NOW.values)])
    order = charts.reverberation([MEASURED, AFTER, NOW]).columns
    assert [name for name in order if name.endswith("(s)") and "," not in name] == [
        "Untreated (s)",
        "Option A (s)",
        "Measured (s)",
    ]


def test_formula_range_reaches_over_all_formulas():
    methods = {"eyring": [0.5, 0.4], "sabine": [0.6, np.inf], "fitzroy": [0.45, 0.7]}
    series = charts.formula_range(methods)
    assert list(series.low) == [0.45, 0.4]
    assert list(series.high) == [0.6, 0.7]
    assert list(series.values) == [0.5, 0.4]


def test_decay_shows_the_fitted_time_and_the_evaluated_range():
    """−5 dB to −25 dB on a line of −60/0.3 dB/s lie at 0.025 s and 0.125 s; T = 0.3 s."""
    time = np.linspace(0, 0.5, 5000)
    curve = DecayCurve(time, -200 * time, (-5, -25), -200.0, 0.0, -47.0, "T20")
    chart = charts.decay(curve)
    assert "T20 = 0.30 s" in chart.description
    assert "−47 dB" in chart.description
    shaded = next(row for row in rows_of(chart.spec) if "end" in row)
    assert (shaded["t"], shaded["end"]) == pytest.approx((0.025, 0.125))


def test_names_from_a_user_stay_text():
    """Markup in a name reaches the picture escaped and leaves no element behind."""
    chart = charts.reverberation([Series(HOSTILE, [0.5] * 8)], title=HOSTILE)
    svg = charts.to_svg(chart)
    assert "<b>" not in svg
    assert "</script>" not in svg
    assert "&lt;b&gt;" in svg
    assert 'role="img"><title>' in svg


def test_long_and_equal_names_stay_apart():
    chart = charts.reverberation(
        [Series("x" * 500, [0.5] * 8), Series("x" * 500, [0.4] * 8, "option-a")]
    )
    names = {row["series"] for row in rows_of(chart.spec) if "series" in row}
    assert len(names) == 2
    assert max(map(len, names)) < 70


def luminance(colour):
    channels = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one, other):
    """WCAG 2.2, definition of contrast ratio."""
    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("theme", [LIGHT, DARK])
def test_colours_can_be_told_from_the_page(theme):
    """WCAG 2.2: 3:1 for graphics (1.4.11), 4.5:1 for text (1.4.3)."""
    for style in STYLES.values():
        assert contrast(style.colour, theme.page) >= 2.99  # two of them are 3.0 as printed
    for text in (theme.ink, theme.soft):
        assert contrast(text, theme.page) >= 4.5
    assert contrast(theme.zone_edge, theme.page) >= 3


def test_series_differ_by_marker_and_by_marker_with_dash():
    assert len({style.marker for style in STYLES.values()}) == 4
    assert len({(style.colour, style.dash) for style in STYLES.values()}) == 4
