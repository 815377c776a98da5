"""The proof, with verdicts decided by hand and a treated room simulated from known coefficients."""

import json
from types import SimpleNamespace

import numpy as np
import pytest

from planner.air import Air
from planner.reconcile import calibrate, compare, prove, prove_room

NAN = float("nan")
HZ = (63, 125, 250, 500, 1000, 2000, 4000, 8000)


def side(predicted, t, u=0.03, predicted_u=0.04):
    prediction = SimpleNamespace(
        bands_hz=HZ,
        methods={"eyring": np.full(8, predicted), "sabine": np.full(8, predicted)},
        u_s=np.full(8, predicted_u),
        assumed_hz=(),
    )
    t = np.broadcast_to(np.asarray(t, float), 8)
    measured = SimpleNamespace(bands_hz=HZ, t_s=t, u_s=np.full(8, u), state="", air=None)
    return compare(prediction, measured)


def target(low=NAN, high=NAN):
    return SimpleNamespace(low=np.full(8, low), high=np.full(8, high))


def test_improvements_by_hand():
    """0.80 → 0.40 s predicted, 0.85 → 0.50 s measured: 0.40 and 0.35 s, u = 0.03 · √2."""
    proof = prove(side(0.80, 0.85), side(0.40, 0.50))
    assert proof.predicted_improvement == pytest.approx(np.full(8, 0.40))
    assert proof.measured_improvement == pytest.approx(np.full(8, 0.35))
    assert proof.measured_improvement_u == pytest.approx(np.full(8, 0.03 * np.sqrt(2)))


@pytest.mark.parametrize(
    ("low", "high", "verdict"),
    [
        (0.30, 0.60, "met"),
        (NAN, 0.60, "met"),
        (0.30, NAN, "met"),
        (0.30, 0.43, "not met"),
        (0.56, 0.80, "not met"),
        (0.30, 0.54, "cannot be told"),
        (0.46, 0.80, "cannot be told"),
        (0.30, 0.46, "cannot be told"),
        (NAN, NAN, ""),
    ],
)
def test_the_interval_decides(low, high, verdict):
    """0.50 ± 1.645 · 0.03 s = 0.451 … 0.549 s at 90 % (normal quantile from any table)."""
    proof = prove(side(0.80, 0.85), side(0.40, 0.50), target=target(low, high))
    assert proof.interval[:, 0] == pytest.approx([0.4507, 0.5493], abs=1e-4)
    assert proof.verdicts == (verdict,) * 8
    assert proof.verdict == verdict


def test_a_higher_confidence_can_take_a_verdict_back():
    """At 99 % the interval is 0.423 … 0.577 s and leaves a limit of 0.56 s undecided."""
    limits = target(0.30, 0.56)
    assert prove(side(0.8, 0.8), side(0.4, 0.5), target=limits).verdict == "met"
    assert prove(side(0.8, 0.8), side(0.4, 0.5), target=limits, confidence=0.99).verdict == (
        "cannot be told"
    )


def test_one_band_not_met_is_not_met_and_an_unmeasured_band_cannot_be_told():
    limits = target(0.30, 0.60)
    long_bass = [0.9, *[0.45] * 7]
    assert prove(side(0.8, 0.8), side(0.4, long_bass), target=limits).verdict == "not met"
    no_bass = [NAN, *[0.45] * 7]
    proof = prove(side(0.8, 0.8), side(0.4, no_bass), target=limits)
    assert proof.verdicts == ("cannot be told", *["met"] * 7)
    assert proof.verdict == "cannot be told"


@pytest.mark.parametrize("confidence", [0.0, 1.0, 90])
def test_a_confidence_that_is_none_is_refused(confidence):
    with pytest.raises(ValueError, match="between 0 and 1"):
        prove(side(0.8, 0.8), side(0.4, 0.5), confidence=confidence)


def test_words_and_json():
    proof = prove(side(0.80, 0.85), side(0.40, 0.75), target=target(0.30, 0.60))
    assert any("The target is not met (90% confidence" in line for line in proof.words)
    assert any("did less than predicted" in line for line in proof.words)
    content = json.loads(json.dumps(proof.to_json(), allow_nan=False))
    assert content["verdict"] == "not met"
    assert content["verdicts"] == ["not met"] * 8
    assert content["installed"] == []


def test_a_panel_that_was_sold_better_than_it_is(simulate):
    """A simulated room whose panels take 60 % of what was declared: that is found and said."""
    room = simulate(11)
    before = calibrate(room.surfaces, Air(), room.measured)
    treated = room.treat(room.surfaces)
    area = np.zeros(8)
    for part, size, alpha in zip(treated.parts, treated.area, treated.alpha, strict=True):
        true = 0.6 * alpha if part.kind == "panel" else room.truth[part.material]
        area += size * true
    area += treated.item_count @ np.tile(room.truth["person"], (len(treated.items), 1))
    after = SimpleNamespace(**vars(room.measured) | {"t_s": room.formula(area)})
    found = calibrate(treated, Air(), after, prior=before)
    proof = prove(side(0.8, room.measured.t_s), side(0.4, after.t_s), calibration=found)
    assert {row.product for row in proof.installed} == {name for _, name, _, _ in room.panels}
    ceiling = max(room.panels, key=lambda panel: panel[3])[1]
    row = next(row for row in proof.installed if row.product == ceiling)
    middle = slice(3, 7)
    assert (row.found[middle] < row.assumed[middle]).all()
    assert any(ceiling in line and "as sold" in line for line in proof.words)


def test_the_whole_proof_of_a_simulated_room(simulate):
    """Predict, compare and calibrate in one call; the verdict follows the second measurement."""
    room = simulate(12)
    treated = room.treat(room.surfaces)
    proof = prove_room(
        room.surfaces,
        treated,
        Air(),
        room.measured,
        room.measured_treated,
        target=target(0.05, 9.0),
    )
    assert proof.verdict == "met"
    assert (proof.measured_improvement[3:6] > 0).all()
    assert len(proof.installed) == len({name for _, name, _, _ in room.panels})
