"""Files are written whole or not at all."""

import os
import stat

import pytest

from planner import storage
from planner.errors import InputError
from planner.storage import write_atomically


def test_text_and_bytes_are_written_and_folders_made(tmp_path):
    path = tmp_path / "a" / "b.txt"
    assert write_atomically(path, "α = 0.3\n") == path
    assert path.read_bytes() == "α = 0.3\n".encode()
    write_atomically(path, b"\x00\x01")
    assert path.read_bytes() == b"\x00\x01"


def test_permissions_are_kept(tmp_path):
    path = tmp_path / "a.txt"
    path.write_text("old")
    path.chmod(0o640)
    write_atomically(path, "new")
    assert stat.S_IMODE(path.stat().st_mode) == 0o640


def test_a_failing_disk_leaves_the_old_file_and_no_crumbs(tmp_path, monkeypatch):
    path = tmp_path / "a.txt"
    path.write_text("old")

    def full(descriptor):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(InputError, match=r"a\.txt: cannot be written \(No space left on device\)"):
        write_atomically(path, "new")
    assert path.read_text() == "old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["a.txt"]
    assert storage.__doc__
