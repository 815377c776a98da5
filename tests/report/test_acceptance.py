"""Verdicts are decided by the interval of the measurement."""

import numpy as np
import pytest

from planner.report.acceptance import MET, NOT_MET, UNCLEAR, acceptance_document, judge
from planner.report.html import to_html

NAN = np.nan


def one(t, u, low, high, confidence=0.95):
    rest = np.full(7, NAN)
    return judge([t, *rest], [u, *rest], [low, *rest], [high, *rest], confidence=confidence)


@pytest.mark.parametrize(
    ("t", "u", "low", "high", "verdict"),
    [
        (0.30, 0.01, 0.20, 0.35, MET),  # 0.280 to 0.320
        (0.30, 0.03, 0.20, 0.35, UNCLEAR),  # 0.241 to 0.359
        (0.40, 0.02, 0.20, 0.35, NOT_MET),  # 0.361 to 0.439
        (0.36, 0.02, 0.20, 0.35, UNCLEAR),  # 0.321 to 0.399: the middle outside decides nothing
        (0.15, 0.02, 0.20, 0.35, NOT_MET),
        (0.30, 0.01, NAN, 0.35, MET),
        (0.10, 0.01, NAN, 0.35, MET),
        (0.30, 0.01, 0.20, NAN, MET),
        (NAN, NAN, 0.20, 0.35, UNCLEAR),
        (0.30, NAN, 0.20, 0.35, UNCLEAR),
        (0.30, 0.01, NAN, NAN, ""),
    ],
)
def test_verdict_by_the_95_percent_interval(t, u, low, high, verdict):
    """1.96 standard uncertainties to each side (normal distribution), worked by hand."""
    assert one(t, u, low, high).verdicts[0] == verdict


def test_confidence_widens_the_interval():
    """0.33 ± k·0.01 against 0.35: k = 1.645 (90 %) is inside, k = 2.576 (99 %) is not."""
    assert one(0.33, 0.01, 0.2, 0.35, confidence=0.90).verdicts[0] == MET
    assert one(0.33, 0.01, 0.2, 0.35, confidence=0.99).verdicts[0] == UNCLEAR
    with pytest.raises(ValueError, match="between 0 and 1"):
        one(0.33, 0.01, 0.2, 0.35, confidence=1.0)


def test_whole_room_is_met_only_when_every_judged_band_is():
    good, bad, doubt = (0.3, 0.01), (0.5, 0.01), (0.35, 0.01)
    low, high = np.full(8, 0.2), np.full(8, 0.35)

    def overall(*bands):
        t, u = zip(*bands, strict=True)
        return judge(t, u, low, high)

    assert overall(*[good] * 8).overall == MET
    assert overall(*[good] * 7, doubt).overall == UNCLEAR
    mixed = overall(*[good] * 6, doubt, bad)
    assert mixed.overall == NOT_MET
    assert "not met at 8000 Hz" in mixed.sentence
    assert "cannot be told at 4000 Hz" in mixed.sentence
    none = judge([0.3] * 8, [0.01] * 8, np.full(8, NAN), np.full(8, NAN))
    assert none.overall == ""
    assert "no target" in none.sentence


def test_sheet_says_every_band_with_its_interval_and_verdict(sample):
    target = sample.target()
    acceptance = judge(sample.after, 0.01 * sample.after, target.low, target.high)
    page = to_html(acceptance_document(acceptance, target, room="Invented room"))
    for hz in (63, 125, 250, 500, 1000, 2000, 4000, 8000):
        assert f"<td>{hz} Hz</td>" in page
    assert "0.27 to 0.29" in page  # 0.28 ± 0.0055
    assert "● met" in page
    assert "Invented handbook" in page
