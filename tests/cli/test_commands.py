"""Every command: what it promises in JSON, its exit codes, and refusals without a traceback."""

import json
import subprocess
import sys

import numpy as np
import pytest
import soundfile

from planner.cli import main

OCTAVES = [63, 125, 250, 500, 1000, 2000, 4000, 8000]


@pytest.fixture
def run(capsys):
    def go(*words, code=0):
        assert main([str(word) for word in words]) == code
        out, err = capsys.readouterr()
        return json.loads(out) if "--json" in words and out else out or err

    return go


def test_check(run, demo):
    """5.20 × 3.90 × 2.60 m by hand: 52.73 m³, 87.88 m²; the surfaces add up to it."""
    content = run("check", demo, "--json")
    assert content["volume_m3"] == pytest.approx(52.728)
    assert content["surface_m2"] == pytest.approx(87.88)
    assert sum(one["area_m2"] for one in content["surfaces"]) == pytest.approx(87.88)
    assert {"name", "material", "area_m2"} <= set(content["surfaces"][0])
    assert content["warnings"] == []
    assert "52.7 m³" in run("check", demo)


def test_predict(run, demo):
    content = run("predict", demo, "--json")
    promised = {
        "bands_hz", "methods", "u_s", "absorption_area_m2", "speed_of_sound_m_s", "air_m_per_m", "target",
        "schroeder_hz", "volume_m3", "surface_m2", "assumed_hz", "warnings",
    }  # fmt: skip
    assert promised <= set(content)
    assert content["bands_hz"] == OCTAVES
    assert list(content["methods"])[:2] == ["sabine", "eyring"]
    assert all(
        e <= s
        for e, s in zip(content["methods"]["eyring"], content["methods"]["sabine"], strict=True)
    )
    treated = run("predict", demo, "--option", demo / "options/first.toml", "--json")
    assert treated["methods"]["eyring"][4] < 0.5 * content["methods"]["eyring"][4]
    run("predict", demo, "--strict", code=1)
    simulated = run("predict", demo, "--simulate", "--json")
    assert len(simulated["methods"]["simulated"]) == 8


def test_modes(run, demo):
    """By hand: 343.79 m/s at 21 °C over 2 · 5.20 m is 33.06 Hz."""
    content = run("modes", demo, "--up-to", "100", "--json")
    assert content["modes"][0]["hz"] == pytest.approx(33.06, abs=0.01)
    assert set(content["modes"][0]) == {"hz", "n", "kind", "t_s"}
    assert {"schroeder_hz", "third_octave_count"} <= set(content)
    varied = run("modes", demo, "--height", "2.5:2.7", "--json")["varied"]
    assert all(2.5 <= one["height_m"] <= 2.7 for one in varied)
    assert "Better:" in run("modes", demo, "--vary")
    assert "is no range" in run("modes", demo, "--height", "2.5", code=2)


def test_seat(run, demo):
    """The floor's reflection by hand: loudspeaker and seat 1.2 m up, √(2.1² + 0.8² + 2.4²) − √(2.1² + 0.8²) = 1.04 m, 3.0 ms."""
    content = run("seat", demo, "--search", "--json")
    floor = next(one for one in content["reflections"] if one["surfaces"] == ["floor"])
    assert floor["delay_ms"] == pytest.approx(3.02, abs=0.02)
    assert content["search"]["unevenness_after_db"] <= content["search"]["unevenness_before_db"]
    assert "dB uneven" in run("seat", demo)


def test_first_reflections_can_be_required(run, demo, tmp_path):
    """The suggestion then covers them: a panel lies over each area that is not kept clear."""
    text = (demo / "room.toml").read_text(encoding="utf-8")
    room = tmp_path / "room.toml"
    room.write_text(
        text.replace("wall_type =", "cover_first_reflections = true\nwall_type ="), encoding="utf-8"
    )
    (tmp_path / "catalogue.csv").write_bytes((demo / "catalogue.csv").read_bytes())
    content = run("suggest", room, "--json", "-o", tmp_path / "x.toml")
    assert content["status"] == "optimal"
    surfaces = {item["surface"] for item in content["items"]}
    assert {"left", "right", "ceiling", "front"} <= surfaces


def test_noise(run, demo, tmp_path):
    content = run(
        "noise", tmp_path / "pink.flac", "--bursts", "2", "--rate", "44100", "--seed", "7", "--json"
    )
    assert len(content["bursts"]) == 2
    assert content["rate_hz"] == 44100
    assert content["seed"] == 7
    info = soundfile.info(tmp_path / "pink.flac")
    assert info.samplerate == 44100
    assert info.subtype == "PCM_24"
    sheet = (tmp_path / "pink.txt").read_text(encoding="utf-8")
    assert "ear protection" in sheet
    assert "net loft" in run("noise", tmp_path / "a.wav", "--room", demo)
    assert "no format" in run("noise", tmp_path / "pink.mp3", code=2)
    assert "test signal" in run("noise", tmp_path / "a.wav", "--bursts", "0", code=2)


def test_measure_and_compare(run, demo, tmp_path):
    """The demo's plasterboard "really" absorbs 0.15 at 125 Hz; its table says 0.29. The loop must find it."""
    out = tmp_path / "m.csv"
    content = run("measure", demo / "recordings", "-o", out, "--room", demo, "--json")
    promised = {
        "bands_hz",
        "t_s",
        "used",
        "u_s",
        "t20_s",
        "t30_s",
        "edt_s",
        "range_db",
        "flags",
        "recordings",
    }
    assert promised <= set(content)
    assert len(content["recordings"]) == 6
    assert all(len(one["stops_s"]) == 4 for one in content["recordings"])
    compared = run("compare", demo, out, "--json")
    assert {"bands_hz", "predicted", "measured", "difference_s", "z", "calibrated"} <= set(compared)
    rows = {(row["material"], row.get("band_hz")): row for row in compared["calibrated"]}
    found = next(row for (name, _), row in rows.items() if name == "plasterboard-on-studs")
    band = OCTAVES.index(125)
    prior, posterior, u = (np.atleast_1d(found[key]) for key in ("prior", "posterior", "u"))
    at = band if len(posterior) == 8 else 0
    assert prior[at] == pytest.approx(0.29)
    assert abs(posterior[at] - 0.15) < 2.5 * u[at] + 0.02


def test_suggest_buy_report(run, demo, tmp_path):
    option = tmp_path / "options" / "x.toml"
    content = run("suggest", demo, "-o", option, "--json")
    promised = {"status", "items", "cost", "predicted", "probability", "gap", "short_bands"}
    assert promised <= set(content)
    assert content["status"] == "optimal"
    assert content["gap"] <= 1e-6
    target = run("predict", demo, "--option", option, "--json")
    for t, low, high, hz in zip(
        target["methods"]["eyring"],
        target["target"]["low"],
        target["target"]["high"],
        OCTAVES,
        strict=True,
    ):
        assert hz in (63, 8000) or low - 1e-6 <= t <= high + 1e-6
    bought = run("buy", demo, option, "-o", tmp_path / "list.csv", "--json")
    assert bought["total"] == pytest.approx(content["cost"])
    assert {"item", "packs", "pieces", "area_m2", "weight_kg", "cost"} <= set(bought["lines"][0])
    assert (tmp_path / "list.csv").stat().st_size > 100
    assert "escape routes" in run("buy", demo, option)
    for name in ("r.pdf", "r.html"):
        written = run("report", demo, "--option", option, "-o", tmp_path / name, "--json")[
            "written"
        ]
        assert written == str(tmp_path / name)
        assert (tmp_path / name).stat().st_size > 5000


def test_an_impossible_target_is_answered_with_no(run, demo):
    content = run("suggest", demo, "--budget", "100", "--json", code=1)
    assert content["status"] == "infeasible"
    short = content["short_bands"][0]
    assert {"band_hz", "missing_m2", "largest_possible_m2"} <= set(short)


def test_the_demo_walks_the_whole_loop(demo):
    for name in (
        "room.toml",
        "catalogue.csv",
        "measured.csv",
        "options/first.toml",
        "out/list.pdf",
        "out/report.pdf",
    ):
        assert (demo / name).stat().st_size > 200
    assert "invented" in (demo / "catalogue.csv").read_text(encoding="utf-8").lower()
    assert (demo / "out/report.pdf").read_bytes().startswith(b"%PDF")


def test_a_folder_with_something_in_it_is_not_overwritten(run, tmp_path):
    (tmp_path / "mine.txt").write_text("kept")
    assert "nothing is overwritten" in run("demo", tmp_path, code=2)
    assert [one.name for one in tmp_path.iterdir()] == ["mine.txt"]


def test_materials(run):
    content = run("materials", "plasterboard", "studs", "--json")
    assert any(one["id"] == "plasterboard-on-studs" for one in content["materials"])
    assert "nearest" in run("materials", "unobtainium")


def test_a_build_up_is_worked_out(run):
    """50 mm of wool, 10 kPa s/m²: rated by hand from its coefficients after ISO 11654:1997, 5.

    0.33, 0.59, 0.82, 0.93, 0.95 become 0.35, 0.60, 0.80, 0.95, 0.95; against the reference curve at
    0.65 they lack 0.10 + 0.05, at 0.60 only 0.05 of the 0.10 allowed; 2 kHz is 0.35 above it: H.
    """
    content = run("materials", "--build-up", "porous 50 flow_resistivity=10000", "--json")
    rounded = [round(value, 2) for value in content["alpha"][2:7]]
    assert rounded == pytest.approx([0.33, 0.59, 0.82, 0.93, 0.95], abs=0.02)
    assert (content["alpha_w"], content["shape"], content["class"]) == (0.6, "H", "C")
    assert content["basis"] == "model"
    assert "fitted range" in content["warnings"][0]
    shown = run("materials", "--build-up", "porous 50 flow_resistivity=10000 + air 50")
    assert "100 mm deep" in shown
    assert "not a laboratory" in shown
    assert "no layer known" in run("materials", "--build-up", "porus 50", code=2)


@pytest.mark.parametrize(
    "words",
    [
        ["check", "nowhere"],
        ["check"],
        ["nonsense"],
        ["predict", "{demo}", "--option", "nowhere.toml"],
        ["predict", "{demo}", "--measured", "nowhere.csv"],
        ["predict", "{demo}", "--measured", "{demo}/room.toml"],
        ["predict", "{demo}", "--option", "{demo}/room.toml"],
        ["modes", "{demo}", "--up-to", "-3"],
        ["modes", "{demo}", "--up-to", "lots"],
        ["measure", "{demo}/room.toml"],
        ["measure", "{demo}/nowhere.wav"],
        ["measure", "{demo}/options"],
        ["measure", "{demo}/recordings", "--state", "haunted"],
        ["compare", "{demo}", "{demo}/room.toml"],
        ["compare", "{demo}", "{demo}/measured.csv", "{demo}/measured.csv"],
        ["suggest", "{demo}", "--budget", "-5"],
        ["suggest", "{demo}", "--confidence", "2"],
        ["buy", "{demo}", "{demo}/measured.csv"],
        ["buy", "{demo}", "{demo}/options/first.toml", "-o", "{tmp}/list.doc"],
        ["buy", "{demo}", "{demo}/options/first.toml", "-o", "{tmp}/list.pdf", "--paper", "b7"],
        ["report", "{demo}", "-o", "{tmp}/report.docx"],
        ["app", "--port", "80"],
    ],
    ids=lambda words: " ".join(words),
)
def test_bad_input_is_one_message_and_exit_code_2(capsys, demo, tmp_path, words):
    """No traceback, nothing on standard output, one message that says what is wrong."""
    assert main([word.format(demo=demo, tmp=tmp_path) for word in words]) == 2
    out, err = capsys.readouterr()
    assert "Traceback" not in out + err
    assert err.strip()
    assert out == ""


def test_module_and_help(demo):
    """`python -m planner` is the command; help ends with an example that runs."""
    done = subprocess.run(
        [sys.executable, "-m", "planner", "check", str(demo), "--json"],
        capture_output=True,
        check=True,
    )
    assert json.loads(done.stdout)["volume_m3"] == pytest.approx(52.728)
    done = subprocess.run(
        [sys.executable, "-m", "planner", "predict", "--help"],
        capture_output=True,
        check=True,
        text=True,
    )
    assert "Example: planner predict" in done.stdout


def test_help_imports_nothing_heavy():
    """`planner --help` must answer at once: no scipy, pandas, pydantic, streamlit … at import."""
    code = "import sys, planner.cli.main; print(sorted(m for m in sys.modules if m.partition('.')[0] in "
    code += "{'scipy','pandas','streamlit','altair','pydantic','pyroomacoustics','skfem','typst','shapely','soundfile','rich','numpy'} and '.' not in m))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, check=True, text=True)
    assert done.stdout.strip() in ("[]", "['numpy']")


def test_version(run):
    assert "room-treatment-planner" in run("--version")
