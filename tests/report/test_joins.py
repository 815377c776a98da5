"""What other folders work out reaches the report unchanged."""

import hashlib
from dataclasses import replace

import numpy as np
import pytest

from planner.air import Air
from planner.measure.figures import BandDecay
from planner.measure.figures import DecayCurve as Curve
from planner.measure.measured import Measured, RecordingNote
from planner.predict.prediction import predict
from planner.predict.room_modes import room_modes
from planner.reconcile.calibrate import calibrate
from planner.report.charts import decay
from planner.report.joins import (
    alternative,
    calibrated_rows,
    decay_picture,
    input_files,
    measurement_of,
    mode_list,
    product_sources,
)
from planner.report.report import report_document
from planner.report.typeset import to_pdf
from planner.treat.shopping import shopping_list

OCTAVES = (63, 125, 250, 500, 1000, 2000, 4000, 8000)


def measured(times, u=0.02):
    blank = np.full(8, np.nan)
    return Measured(
        bands_hz=OCTAVES, t_s=np.asarray(times, float), u_s=np.full(8, u) * times,
        evaluation=("t20",) * 8, t20_s=blank, t30_s=blank, edt_s=blank, range_db=np.full(8, 45.0),
        positions=(6,) * 8, decays=(12,) * 8, flags=((),) * 8, state="empty", date="2026-01-15",
        recordings=(RecordingNote("a.wav", (1.0,), ("clipped",)),), warnings=("few positions",),
        grade="engineering",
    )  # fmt: skip


def test_measurement_keeps_its_numbers_grade_and_remarks(sample):
    found = measurement_of(measured(sample.now))
    assert list(found.t_s) == list(sample.now)
    assert "engineering" in found.grade
    assert "6 pairs" in found.positions
    assert "12 decays" in found.positions
    assert found.warnings == ("few positions", "a.wav: clipped")


def test_decay_is_drawn_as_it_was_evaluated():
    """A line of −60 dB in 0.3 s from 0 dB: from −5 to −25 dB it runs from 0.025 to 0.125 s."""
    time = np.linspace(0.0, 0.4, 200)
    level = np.maximum(-200 * time, -50.0)
    nan = np.nan
    band = BandDecay(
        band_hz=500.0, edt_s=nan, t10_s=nan, t15_s=nan, t20_s=0.3, t30_s=nan, range_db=50.0,
        level_db=-20.0, floor_db=-70.0, curvature_percent=nan, nonlinearity_permille=nan,
        whole_s=0.31, whole_u_s=0.01, two_slopes_s=None, used="t20", reason="", t_s=0.3, u_s=0.01,
        interval_s=(0.28, 0.32), flags=(),
        curve=Curve(time, level, level + 0.1, (("t20", 0.025, -5.0, 0.125, -25.0),)),
    )  # fmt: skip
    drawn = decay_picture(band)
    assert drawn.slope_db_per_s == pytest.approx(-200)
    assert drawn.start_db == pytest.approx(0, abs=1e-9)
    assert drawn.floor_db == pytest.approx(-50)
    assert "T20 = 0.30 s" in decay(drawn).description
    whole = decay_picture(replace(band, used="whole-decay", t_s=0.31))
    assert "T by the whole decay = 0.31 s" in decay(whole).description
    refused = decay_picture(replace(band, used="", t_s=nan))
    assert "no reverberation time can be read" in decay(refused).description


def test_modes_are_those_of_the_room(sample):
    """Lowest mode of a box: c / 2L with the longest side, here 5.2 m."""
    surfaces, air = sample.report().surfaces, Air()
    found = room_modes(sample.room(), surfaces, air, 150.0, 200.0)
    listed = mode_list(found)
    assert listed.hz[0] == pytest.approx(343.2 / 2 / 5.2, rel=0.005)
    assert listed.labels[0] == "1 0 0"
    assert sum(listed.third_octave_count) <= len(listed.hz) + 1


def test_calibration_rows_name_what_moved_most(sample):
    """A room of two materials measured far livelier at 125 Hz: that coefficient must fall."""
    surfaces, air = sample.report().surfaces, Air()
    times = np.asarray(predict(surfaces, air).time, float).copy()
    times[1] *= 1.15
    rows = calibrated_rows(calibrate(surfaces, air, measured(times), formula="eyring"))
    moved = [row for row in rows if row[0] == "plaster" and row[1] == "125 Hz"]
    assert moved
    assumed, fits = (float(text.split(" ")[0]) for text in moved[0][2:])
    assert fits < assumed


def test_option_is_priced_per_square_metre_of_absorption_it_adds(sample):
    option, catalogue, before = sample.option(), sample.catalogue(), sample.report().surfaces
    bought = shopping_list(option, catalogue, currency="EUR")
    after = before
    for n, item in enumerate(option.items[:3]):
        product = catalogue[item.product]
        area = item.count * product.width * product.height
        after = after.covered(item.surface, f"x{n}", item.product, area, product.coefficients)
    row = alternative(option, predict(after, Air()), bought, catalogue, before, after, chosen=True)
    # 7 · 0.72 + 4 · 0.72 = 7.92 m² of 0.8 hide 7.92 m² of 0.1: 5.544 m² more; 450.70 / 5.544.
    assert row.cost_per_m2_1000 == pytest.approx(450.70 / 5.544, rel=1e-6)
    assert row.depth_mm == 150.0
    assert row.chosen


def test_sources_of_products_and_digests_of_files(sample, tmp_path):
    rows = product_sources(sample.option(), sample.catalogue())
    assert rows[0][1].startswith("(0.80) 0.80")
    assert rows[0][2] == "invented"
    (tmp_path / "room.toml").write_bytes(b"x = 1\n")
    (entry,) = input_files([tmp_path / "room.toml"])
    assert (entry.name, entry.sha256) == ("room.toml", hashlib.sha256(b"x = 1\n").hexdigest())


def test_a_report_of_real_results_is_printed(sample):
    """Prediction, modes and calibration of the other folders, not invented ones."""
    room, air, surfaces = sample.room(), Air(), sample.report().surfaces
    prediction = predict(surfaces, air, sample.target())
    calibration = calibrate(surfaces, air, measured(prediction.time * 1.05), formula="eyring")
    data = sample.report(
        prediction=prediction,
        modes=mode_list(room_modes(room, surfaces, air, 150.0, prediction.schroeder_hz)),
        measurement=measurement_of(measured(prediction.time * 1.05)),
        calibrated=calibrated_rows(calibration),
        calibration_words=calibration.words,
    )
    assert to_pdf(report_document(data)).startswith(b"%PDF")
