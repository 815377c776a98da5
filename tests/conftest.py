"""Fixtures that every folder of tests shares."""

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
