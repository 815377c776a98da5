"""Recordings taken into a project: names, positions, refusals, and no work done twice."""

import shutil

import pytest

from planner.app import survey
from planner.app.survey import evaluated, places, safe_name, survey_text, take
from planner.app.work import open_work
from planner.errors import RecordingError


@pytest.fixture
def work(demo_project, tmp_path):
    shutil.copytree(demo_project, tmp_path / "net-loft")
    return open_work(tmp_path / "net-loft")[0]


@pytest.mark.parametrize(
    ("given", "kept"),
    [
        ("A1.WAV", "A1.wav"),
        ("../../etc/A1.wav", "A1.wav"),
        ("C:\\Users\\me\\B2.flac", "B2.flac"),
        (".wav", "recording.wav"),
        ("a:b*c?.wav", "a_b_c.wav"),
        ("Übung 3.wav", "Übung 3.wav"),
    ],
)
def test_names_lose_their_path_and_keep_their_positions(given, kept):
    assert safe_name(given) == kept


def test_another_file_of_the_same_name_is_kept_beside_it(work, demo_project):
    other = (demo_project / "recordings" / "B2.flac").read_bytes()
    assert "A1-b.flac" in take(work, "A1.flac", other)
    assert "was here already" in take(
        work, "A1.flac", (work.folder / "recordings" / "A1.flac").read_bytes()
    )
    names = {path.name for path in (work.folder / "recordings").iterdir()}
    assert names >= {"A1.flac", "A1-b.flac"}


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("a.wav", b"no sound at all"),
        ("a.wav", b""),
        # A header that claims 2 GB of 24-bit sound, with none behind it.
        ("a.wav", b"RIFF\xff\xff\xff\x7fWAVEfmt \x10\0\0\0\x01\0\x01\0\x80\xbb\0\0\x80\x32\x02\0\x03\0\x18\0data\xda\xff\xff\x7f"),
        ("a.flac", b"fLaC" + b"\xff" * 100),
        ("a.exe", b"MZ"),
        ("survey.csv", b"file,source_position\nA1.flac,A\n"),
        ("survey.csv", b"file,source_position,microphone_position\n../x.wav,A,1\n"),
        ("survey.csv", b"\x00\x01\x02"),
    ],
)  # fmt: skip
def test_an_upload_that_is_none_leaves_nothing_behind(work, name, content):
    before = {path: path.read_bytes() for path in (work.folder / "recordings").iterdir()}
    with pytest.raises(RecordingError):
        take(work, name, content)
    assert {path: path.read_bytes() for path in (work.folder / "recordings").iterdir()} == before


def test_positions_come_from_the_survey_else_from_the_name(work):
    (work.folder / "recordings" / "survey.csv").write_text(
        "file,source_position,microphone_position\nA1.flac,left,sofa\n"
    )
    found = places(work, ["A1.flac", "B2.flac"])
    assert found["A1.flac"].pair == ("left", "sofa")
    assert found["B2.flac"].pair == ("B", "2")


def test_a_survey_with_an_empty_position_is_refused():
    row = {"file": "a.wav", "source_position": "A", "microphone_position": "1"}
    assert survey_text([row]).splitlines()[1].startswith("a.wav,A,1")
    with pytest.raises(RecordingError, match="position is empty"):
        survey_text([{**row, "source_position": ""}])


def test_the_same_recordings_are_not_evaluated_twice(work):
    survey._kept.clear()  # other tests evaluate the same files
    files = [work.folder / "recordings" / name for name in ("A1.flac", "B2.flac")]
    calls = []

    def run(state=""):
        return evaluated(
            work,
            files,
            impulse=False,
            thirds=False,
            state=state,
            progress=lambda *_: calls.append(1),
        )

    first = run()
    assert run() is first
    assert len(calls) == 2
    assert run("occupied") is not first
    files[0].write_bytes(files[1].read_bytes())
    assert run() is not first
