"""The formulas against worked examples, closed-form identities and a reference library."""

import csv
import json
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.predict import reverberation as rt

REFERENCE = Path(__file__).parents[1] / "reference" / "rt_worked_examples.csv"
FEET = {"0.049 V/A in ft": 0.049 / 0.3048, "0.05 V/A in ft": 0.05 / 0.3048}


def examples():
    with REFERENCE.open(encoding="utf-8") as stream:
        return {row["id"]: row for row in csv.DictReader(stream)}


EXAMPLES = examples()


def constant(row):
    """K of the example's own source, in s/m: when a worked example is replayed, its constant is used."""
    text = row["source_constant"]
    if text in FEET:
        return FEET[text]
    if text.startswith("24 ln10/"):
        return 24 * np.log(10) / float(text.removeprefix("24 ln10/"))
    return 55.3 / 345.6 if "345.6" in text else float(text)


def speed(row):
    return 24 * np.log(10) / constant(row)


def parts(row):
    pairs = np.array(json.loads(row["surfaces_area_m2__alpha"]))
    return pairs[:, 0], pairs[:, 1:]


def printed(row):
    """Printed value and half a unit of its last digit."""
    text = row["T_printed_s"] or row["T_recomputed_source_constant_s"]
    return float(text), 0.5 * 10.0 ** -len(text.partition(".")[2])


SABINE = [
    row
    for row in EXAMPLES.values()
    if row["formula"].startswith("Sabine") and row["surfaces_area_m2__alpha"] and row["id"] != "C16"
]


@pytest.mark.parametrize("row", SABINE, ids=lambda row: row["id"])
def test_published_sabine_examples_to_their_printed_digits(row):
    """Sources in tests/reference/rt_worked_examples.csv, row by row."""
    area, alpha = parts(row)
    m = 1.0e-3 if row["id"] == "C3b" else 0.0
    value = rt.sabine(
        float(row["V_m3"]), area @ alpha, air_attenuation=m, speed_of_sound=speed(row)
    )
    expected, half = printed(row)
    # C3b prints a rounded air term (0.12 for 0.119 m²); all rows: half a unit of the last digit.
    assert float(value[0]) == pytest.approx(expected, abs=half * 1.02)


def test_published_eyring_example():
    """C12: 8 × 5 × 3 m, 0.2 everywhere: 24 ln(10) 120 / (343 · 158 · −ln 0.8)."""
    row = EXAMPLES["C12"]
    area, alpha = parts(row)
    mean = (area @ alpha) / area.sum()
    value = rt.eyring(float(row["V_m3"]), area.sum(), mean)
    assert float(value[0]) == pytest.approx(float(row["T_printed_s"]), abs=1e-9)


def test_eyring_with_air():
    """X4, an independent script: 8 kHz, 20 °C, 50 % relative humidity."""
    row = EXAMPLES["X4"]
    area, alpha = parts(row)
    mean = (area @ alpha) / area.sum()
    value = rt.eyring(float(row["V_m3"]), area.sum(), mean, air_attenuation=0.023927)
    assert float(value[0]) == pytest.approx(float(row["T_recomputed_source_constant_s"]), abs=5e-6)


@pytest.mark.parametrize(
    ("name", "function"),
    [("C14", rt.fitzroy), ("X1", rt.arau_puchades)],
)
def test_directional_examples(name, function):
    """C14: an open library's check value; X1: an independent script. Wall pairs along x, y, z."""
    row = EXAMPLES[name]
    area, alpha = parts(row)
    value = function(float(row["V_m3"]), area, alpha)
    expected = float(row["T_recomputed_source_constant_s"])
    assert float(value[0]) == pytest.approx(expected, abs=1e-6)


def test_millington_sette_and_kuttruff_examples():
    """X2 and X3, an independent script."""
    row = EXAMPLES["X2"]
    area, alpha = parts(row)
    volume = float(row["V_m3"])
    value = rt.millington_sette(volume, area, alpha)
    assert float(value[0]) == pytest.approx(float(row["T_recomputed_source_constant_s"]), abs=1e-6)
    row = EXAMPLES["X3"]
    mean = (area @ alpha) / area.sum()
    value = rt.kuttruff(volume, area.sum(), mean, path_variance=0.4)
    assert float(value[0]) == pytest.approx(float(row["T_recomputed_source_constant_s"]), abs=1e-6)


room = st.tuples(st.floats(10, 500), st.floats(30, 500))
coefficient = st.floats(0.005, 0.95)


@given(room, coefficient, st.floats(0, 0.03))
def test_a_reference_library_agrees(size, alpha, m):
    """pyroomacoustics: its Sabine with air, its Eyring without (0.10.1 has that sign wrong)."""
    from pyroomacoustics.acoustics import rt60_eyring, rt60_sabine

    volume, surface = size
    ours = rt.sabine(volume, [surface * alpha], air_attenuation=m)
    assert float(ours[0]) == pytest.approx(rt60_sabine(surface, volume, alpha, m, 343.0))
    ours = rt.eyring(volume, surface, [alpha])
    assert float(ours[0]) == pytest.approx(rt60_eyring(surface, volume, alpha, 0.0, 343.0))


areas = st.lists(st.floats(0.5, 60), min_size=6, max_size=6)
alphas = st.lists(coefficient, min_size=6, max_size=6)
NORMALS = np.array([(0, 0, 1), (0, 0, -1), (0, 1, 0), (0, -1, 0), (1, 0, 0), (-1, 0, 0)], float)


def all_times(volume, area, alpha, m=0.0):
    """By each formula, from parts: shape of one band."""
    area, alpha = np.asarray(area), np.asarray(alpha)[:, None]
    surface, mean = area.sum(), (area @ alpha) / area.sum()
    axes = rt.axis_shares(area, NORMALS, alpha)
    air = {"air_attenuation": m}
    return {
        "sabine": rt.sabine(volume, area @ alpha, **air)[0],
        "eyring": rt.eyring(volume, surface, mean, **air)[0],
        "millington_sette": rt.millington_sette(volume, area, alpha, **air)[0],
        "fitzroy": rt.fitzroy(volume, *axes, **air)[0],
        "arau_puchades": rt.arau_puchades(volume, *axes, **air)[0],
    }


@given(st.floats(10, 500), areas, alphas, st.floats(0, 0.03))
def test_order_of_the_formulas(volume, area, alpha, m):
    """Eyring ≤ Sabine, Millington–Sette ≤ Eyring (both by Jensen), Arau-Puchades ≤ Fitzroy (means)."""
    t = all_times(volume, area, alpha, m)
    slack = 1 + 1e-12
    assert t["eyring"] <= t["sabine"] * slack
    assert t["millington_sette"] <= t["eyring"] * slack
    assert t["arau_puchades"] <= t["fitzroy"] * slack


@given(st.floats(10, 500), areas, coefficient, st.floats(0, 0.03))
def test_uniform_coefficients_make_all_logarithmic_formulas_equal(volume, area, alpha, m):
    """Identity: with one coefficient everywhere each of them is Eyring's."""
    t = all_times(volume, area, [alpha] * 6, m)
    for name in ("millington_sette", "fitzroy", "arau_puchades"):
        assert t[name] == pytest.approx(t["eyring"])
    assert rt.uneven_absorption(area, np.full((6, 1), alpha)) == pytest.approx([0.0], abs=1e-12)


@given(st.floats(10, 500), areas)
def test_small_coefficients_make_eyring_sabine(volume, area):
    """−ln(1 − α) = α (1 + α/2 + …): at 1e-4 the two agree within 0.01 %."""
    t = all_times(volume, area, [1e-4] * 6)
    assert t["eyring"] == pytest.approx(t["sabine"], rel=1e-4)


@given(st.floats(10, 500), areas, alphas, st.integers(0, 5), st.floats(0.001, 0.4))
def test_more_absorption_never_lengthens(volume, area, alpha, which, more):
    before = all_times(volume, area, alpha)
    after = all_times(
        volume, area, [min(a + more * (n == which), 0.95) for n, a in enumerate(alpha)]
    )
    for name, time in after.items():
        assert time <= before[name] * (1 + 1e-12)


@given(st.floats(10, 500), areas, alphas, st.floats(0.5, 3))
def test_a_room_scaled_by_k_rings_k_times_as_long(volume, area, alpha, k):
    """V grows with k³ and S with k²; no air."""
    small = all_times(volume, area, alpha)
    large = all_times(volume * k**3, np.asarray(area) * k**2, alpha)
    for name, time in large.items():
        assert time == pytest.approx(k * small[name])


@given(areas, alphas)
def test_axis_shares_of_a_rectangle_are_its_wall_pairs(area, alpha):
    shares, means = rt.axis_shares(area, NORMALS, np.array(alpha)[:, None])
    a, s = np.array(alpha), np.array(area)
    for axis, (one, other) in enumerate([(4, 5), (2, 3), (0, 1)]):
        pair = s[one] + s[other]
        assert shares[axis] == pytest.approx(pair)
        assert means[axis, 0] == pytest.approx((s[one] * a[one] + s[other] * a[other]) / pair)


@given(st.floats(0, 2 * np.pi))
def test_axis_shares_add_up_whichever_way_a_wall_faces(angle):
    normal = [[np.cos(angle), np.sin(angle), 0.0]]
    shares, _ = rt.axis_shares([7.0], normal, [[0.3]])
    assert shares.sum() == pytest.approx(7.0)


def test_nothing_absorbs():
    """inf, never NaN; with air the time is that of the air: k / (4 m)."""
    t = all_times(60, [10] * 6, [0.0] * 6)
    assert all(np.isinf(value) for value in t.values())
    t = all_times(60, [10] * 6, [0.0] * 6, m=0.01)
    expected = 24 * np.log(10) / 343 / 0.04
    assert all(value == pytest.approx(expected) for value in t.values())


def test_laboratory_values_above_one_are_capped_in_logarithms_only():
    t = all_times(60, [10] * 6, [1.2] * 6)
    assert t["sabine"] == pytest.approx(24 * np.log(10) / 343 * 60 / 72)
    assert t["eyring"] == pytest.approx(24 * np.log(10) / 343 * 60 / (60 * -np.log(0.01)))


def test_bands_stay_on_the_last_axis():
    volume = np.array([40.0, 60.0])[:, None]
    assert rt.sabine(volume, np.full((2, 8), 9.0), air_attenuation=np.zeros(8)).shape == (2, 8)
    assert rt.eyring(volume, np.array([[70.0], [90.0]]), np.full((2, 8), 0.2)).shape == (2, 8)


def test_schroeder_frequency():
    """Kuttruff (3.44): 40 m³ and 0.3 s give 173 Hz."""
    assert float(rt.schroeder_frequency(0.3, 40.0)) == pytest.approx(173.2, abs=0.05)


def test_hard_objects():
    """EN 12354-6:2003, formula 4, by hand: 0.125 m³ is 0.25 m²."""
    assert float(rt.hard_object_area(0.125)) == pytest.approx(0.25)
