"""Midbands against IEC 61260-1:2014 and ISO 266."""

import pytest

from planner.bands import OCTAVES, THIRDS, band_edges, band_label, bandwidth, exact_midband


@pytest.mark.parametrize(
    ("nominal", "exact"),
    [(63, 63.096), (125, 125.893), (250, 251.189), (500, 501.187), (1000, 1000.0), (2000, 1995.262),
     (4000, 3981.072), (8000, 7943.282)],
)  # fmt: skip
def test_exact_octave_midbands(nominal, exact):
    """IEC 61260-1:2014, base ten: G = 10^0.3, reference 1 kHz; three decimals."""
    assert exact_midband(nominal) == pytest.approx(exact, abs=5e-4)


@pytest.mark.parametrize(("nominal", "exact"), [(50, 50.119), (800, 794.328), (6300, 6309.573)])
def test_exact_third_octave_midbands(nominal, exact):
    """ISO 9613-1:1993, table 1, prints these midband frequencies."""
    assert exact_midband(nominal, fraction=3) == pytest.approx(exact, abs=5e-4)


def test_neighbouring_bands_share_an_edge():
    """IEC 61260-1:2014: edges f_m G^(±1/2b) tile the axis."""
    for nominal, fraction in ((OCTAVES, 1), (THIRDS, 3)):
        low, high = band_edges(nominal, fraction=fraction)
        assert high[:-1] == pytest.approx(low[1:])


def test_bandwidths():
    """0.7046 and 0.2308 of the midband for base-ten octaves and thirds; by hand from G."""
    assert bandwidth(1000) == pytest.approx(704.6, abs=0.05)
    assert bandwidth(1000, fraction=3) == pytest.approx(230.8, abs=0.05)


def test_the_octave_from_1_to_2_khz_is_1_khz_wide():
    """Common practice, no source: an octave is as wide as its lower edge."""
    low, high = band_edges([1000, 8000])
    assert (high / low) == pytest.approx([2, 2], rel=0.003)
    assert (high - low) == pytest.approx(low, rel=0.006)


def test_labels():
    assert [band_label(hz) for hz in (63, 1000, 2500)] == ["63", "1k", "2.5k"]
