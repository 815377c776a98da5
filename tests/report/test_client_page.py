"""The first page says what is measured, what is predicted and what is assumed."""

from dataclasses import replace

import numpy as np

from planner.report.document import Table
from planner.report.report_client import client_page


def page(data):
    (section,) = client_page(data)
    words = " ".join(block.text for block in section.blocks if hasattr(block, "text"))
    (table,) = [block for block in section.blocks if isinstance(block, Table)]
    return words, {row[0]: row[1:] for row in table.rows}


def test_measured_times_are_called_measured_and_the_rest_by_its_name(sample):
    data = sample.report()
    words, rows = page(data)
    assert "0.63 s (measured" in words  # mean of 0.62 and 0.60, times 1.04
    assert rows["63 Hz"] == ("0.96", "0.61 (assumed)", "up to 0.60")
    times = np.array(data.measurement.t_s)
    times[[0, 1]] = np.nan
    words, rows = page(sample.report(measurement=replace(data.measurement, t_s=times)))
    assert rows["63 Hz"][0] == "0.92 (assumed)"
    assert rows["125 Hz"][0] == "0.84 (predicted)"
    assert rows["250 Hz"][0] == "0.74"


def test_without_a_measurement_everything_now_is_predicted(sample):
    words, rows = page(sample.report(measurement=None))
    assert "0.61 s (predicted" in words
    assert rows["63 Hz"][0] == "0.92 (assumed)"
    assert rows["500 Hz"][0] == "0.62"


def test_no_verdict_without_its_doubt(sample):
    words, _ = page(sample.report())
    assert "likely (probability 87 %)" in words
    words, _ = page(sample.report(after=None, suggestion=None))
    assert "After:" not in words


def test_cost_says_when_something_has_no_price(sample):
    words, _ = page(sample.report())
    assert "Cost: 450.70 EUR for whole packs, not counting what has no price yet." in words
