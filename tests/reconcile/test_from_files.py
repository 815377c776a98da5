"""The whole step from a room file and a table of measured times, as a command would do it."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from planner.errors import MeasuredError
from planner.measure.measured import Measured, read_measured, write_measured
from planner.predict.prediction import predict
from planner.predict.targets import own_limits
from planner.reconcile import calibrate_room, compare_room, prove_room
from planner.room.files import parse_room, read_room
from planner.room.surfaces import room_surfaces

ROOM = Path(__file__).parents[1] / "room" / "good.toml"
HZ = (63, 125, 250, 500, 1000, 2000, 4000, 8000)
SPEED = 343.2 * np.sqrt((273.15 + 21) / 293.15)
VOLUME, SURFACE = 5.2 * 3.9 * 2.6, 2 * (5.2 * 3.9 + 5.2 * 2.6 + 3.9 * 2.6)


def table(t, state="occupied"):
    t = np.asarray(t, float)
    blank = np.full(8, np.nan)
    return Measured(
        bands_hz=HZ,
        t_s=t,
        u_s=0.04 * t,
        evaluation=("t20",) * 8,
        t20_s=t,
        t30_s=blank,
        edt_s=blank,
        range_db=np.full(8, 45.0),
        positions=(6,) * 8,
        decays=(12,) * 8,
        flags=((),) * 8,
        state=state,
    )


def eyring_without_air(area):
    return 24 * np.log(10) * VOLUME / (SPEED * -SURFACE * np.log(1 - area / SURFACE))


@pytest.fixture(scope="module")
def room():
    """The room of the tests: 5.2 × 3.9 × 2.6 m, plasterboard, two persons."""
    return read_room(ROOM)


@pytest.fixture(scope="module")
def stiffer(room):
    """Measured: its wall boards take half as much as the table says; air left out below 2 kHz."""
    surfaces = room_surfaces(room)
    alpha = surfaces.alpha.copy()
    alpha[[part.material == "plasterboard-on-studs" for part in surfaces.parts]] *= 0.5
    area = surfaces.area @ alpha + surfaces.item_count @ surfaces.item_area
    t = eyring_without_air(area)
    t[5:] = np.nan
    return table(t)


def test_compare_a_room_file_with_a_table(room, stiffer, tmp_path):
    write_measured(tmp_path / "measured.csv", stiffer)
    result = compare_room(room, read_measured(tmp_path / "measured.csv"))
    assert (result.difference_s[:3] > 0).all()
    content = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert {"bands_hz", "predicted", "measured", "difference_s", "z", "calibrated"} <= set(content)
    assert content["measured"][5:] == [None, None, None]
    studs = next(e for e in content["calibrated"] if e["material"] == "plasterboard-on-studs")
    assert studs["posterior"][1] < studs["prior"][1]
    assert "Nothing can be compared at 2k, 4k, 8k Hz: no value was measured." in content["words"]


def test_a_calibrated_room_predicts_what_was_measured(room, stiffer):
    calibration = calibrate_room(room, stiffer)
    air = room.air_state()
    before = predict(calibration.described, air, methods=("eyring",), draws=0).time
    after = predict(calibration.surfaces, air, methods=("eyring",), draws=0).time
    known = slice(0, 5)
    assert after == pytest.approx(calibration.fitted, rel=0.005)
    worse, better = (np.abs(np.log(t / stiffer.t_s))[known] for t in (before, after))
    assert (better[:3] < 0.5 * worse[:3]).all()


def test_a_table_of_another_state_is_compared_but_not_learnt_from(room, stiffer):
    result = compare_room(room, replace(stiffer, state="empty"))
    assert result.calibration is None
    assert any("measured empty but is described occupied" in line for line in result.warnings)
    assert any(line.startswith("No coefficients are corrected") for line in result.warnings)
    with pytest.raises(MeasuredError, match="state"):
        calibrate_room(room, replace(stiffer, state="empty"))


def test_a_room_typed_in_the_wrong_unit_is_found(stiffer):
    """The same file with feet instead of metres is no room; one typed in feet under metres is."""
    text = ROOM.read_text(encoding="utf-8")
    plain = text[: text.index("[[opening]]")] + '[treatment]\nformula = "sabine"\n'
    typed_in_feet = plain.replace("5.20", "17.06").replace("3.90", "12.80").replace("2.60", "8.53")
    result = compare_room(parse_room(typed_in_feet), replace(stiffer, state="empty"))
    assert any("feet while the file says metres" in line for line in result.warnings)


def test_a_proof_from_two_tables(room, stiffer):
    surfaces = room_surfaces(room)
    panel = room_surfaces(room)  # stands for a treated room: a carpet on the whole floor
    values = next(
        (a, u)
        for p, a, u in zip(surfaces.parts, surfaces.alpha, surfaces.u, strict=True)
        if p.material == "carpet-on-underlay"
    )
    from planner.absorption.library import Coefficients

    treated = panel.covered(
        "ceiling",
        "cloud",
        "cloud",
        8.0,
        Coefficients(values[0] + 0.3, values[1], np.zeros(8, bool)),
    )
    after = table(0.6 * stiffer.t_s)
    proof = prove_room(
        surfaces,
        treated,
        room.air_state(),
        stiffer,
        after,
        target=own_limits({}, {125: 2.0, 500: 2.0}),
        state="occupied",
    )
    assert proof.verdict == "met"
    assert proof.verdicts.count("met") == 2
    assert [row.product for row in proof.installed] == ["cloud"]
