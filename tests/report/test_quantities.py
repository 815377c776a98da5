"""Numbers in feet and pounds: 1 ft = 0.3048 m and 1 lb = 0.45359237 kg, exact by definition."""

import pytest

from planner.report.quantities import Quantities


@pytest.mark.parametrize(
    ("metric", "imperial"),
    [
        # 2.4 / 0.09290304 = 25.83…: an allowance rounds up, or it would not be enough.
        ("allow 2.4 m² more on the back", "allow 25.9 ft² more on the back"),
        ("let the ceiling carry 20 kg more", "let the ceiling carry 44.1 lb more"),
        ("sheets of 10 kg/m² at most", "sheets of 10 kg/m² at most"),
        ("raise the budget by 300 EUR", "raise the budget by 300 EUR"),
    ],
)  # fmt: skip
def test_sentences_change_their_units(metric, imperial):
    assert Quantities("ft").sentence(metric) == imperial
    assert Quantities("m").sentence(metric) == metric
