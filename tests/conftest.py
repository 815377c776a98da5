"""Fixtures that every folder of tests shares."""

import contextlib
import io
import os
from pathlib import Path

import pytest
from hypothesis import settings

# The first call of a test may import a heavy library; a deadline would time that.
settings.register_profile("planner", deadline=None, derandomize=True)
settings.load_profile("planner")

RECORDINGS = Path(__file__).resolve().parents[2] / "shared" / "reference" / "recordings"


@pytest.fixture(scope="session")
def recordings_dir() -> Path:
    """The folder with two real recordings, kept beside the checkout and not in it."""
    if not RECORDINGS.is_dir():
        message = "the two real recordings do not lie beside this checkout"
        if os.environ.get("CI"):
            pytest.fail(message)
        pytest.skip(message)
    return RECORDINGS


@pytest.fixture(scope="session")
def demo_project(tmp_path_factory) -> Path:
    """The invented project after its own loop; tests read it and change nothing in it."""
    from planner.cli import main

    place = tmp_path_factory.mktemp("demo") / "net-loft"
    with contextlib.redirect_stdout(io.StringIO()), contextlib.redirect_stderr(io.StringIO()):
        assert main(["demo", str(place)]) == 0
    return place
