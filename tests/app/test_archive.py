"""Projects as zip files: what goes in, and what must not come out."""

import io
import stat
import zipfile

import pytest

from planner.app.archive import packed, unpack
from planner.errors import ProjectError
from planner.measure.measurement import SOUND


def archive(entries):
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as out:
        for name, content in entries.items():
            out.writestr(name, content)
    return buffer.getvalue()


def test_a_project_comes_back_as_it_was(tmp_path, demo_project):
    unpack(packed(demo_project), tmp_path / "again")
    for path in demo_project.rglob("*.*"):
        assert (
            tmp_path / "again" / path.relative_to(demo_project)
        ).read_bytes() == path.read_bytes()


def test_recordings_can_stay_behind(tmp_path, demo_project):
    small = packed(demo_project, recordings=False)
    assert len(small) < len(packed(demo_project)) / 2
    written = unpack(small, tmp_path / "again")
    assert not any(path.suffix == ".flac" for path in written)
    assert (tmp_path / "again" / "recordings" / "survey.csv").is_file()


def test_a_folder_inside_the_zip_is_fine(tmp_path):
    unpack(archive({"x/room.toml": "a", "x/options/b.toml": "b", "y.exe": "c"}), tmp_path)
    assert (tmp_path / "room.toml").read_text() == "a"
    assert (tmp_path / "options" / "b.toml").read_text() == "b"
    assert not (tmp_path / "y.exe").exists()


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"no zip", "no zip"),
        (archive({"a.txt": "x"}), "no room.toml"),
        (archive({"room.toml": "x", "../evil.toml": "x"}), "leaves the project"),
        (archive({"room.toml": "x", "/etc/evil.toml": "x"}), "leaves the project"),
        (archive({"room.toml": "x", "a/../../evil.toml": "x"}), "leaves the project"),
        (archive({"room.toml": "x", "..\\evil.toml": "x"}), "leaves the project"),
        (archive({"room.toml": "x", "C:evil.toml": "x"}), "leaves the project"),
        (archive({"room.toml": "x", "big.csv": b"0" * 5_000_000}), "claims"),
        (archive({f"{n}.csv": "x" for n in range(600)} | {"room.toml": "x"}), "601 files"),
    ],
    ids=["bytes", "no-room", "up", "absolute", "inside-up", "backslash", "drive", "bomb", "many"],
)
def test_hostile_archives_write_nothing(tmp_path, content, words):
    target = tmp_path / "inner" / "project"
    target.mkdir(parents=True)
    with pytest.raises(ProjectError, match=words):
        unpack(content, target)
    assert [path for path in tmp_path.rglob("*") if path.is_file()] == []


def test_links_are_refused(tmp_path):
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w") as out:
        out.writestr("room.toml", "x")
        link = zipfile.ZipInfo("passwords.txt")
        link.external_attr = (stat.S_IFLNK | 0o777) << 16
        out.writestr(link, "/etc/passwd")
    with pytest.raises(ProjectError, match="link"):
        unpack(buffer.getvalue(), tmp_path)


def test_a_damaged_archive(tmp_path):
    content = bytearray(archive({"room.toml": "x" * 1000}))
    content[45] ^= 0xFF
    with pytest.raises(ProjectError):
        unpack(bytes(content), tmp_path)


def test_every_kind_of_recording_and_silence_come_out_again(tmp_path):
    """Whatever may be uploaded is part of the project; zeros pack a thousandfold and are no bomb."""
    folder = tmp_path / "mine"
    (folder / "recordings").mkdir(parents=True)
    (folder / "room.toml").write_text("name = 'x'", encoding="utf-8")
    for ending in SOUND:
        (folder / "recordings" / f"a{ending}").write_bytes(bytes(2_000_000))
    unpack(packed(folder), tmp_path / "again")
    found = {path.suffix for path in (tmp_path / "again" / "recordings").iterdir()}
    assert found == set(SOUND)
