"""Fixtures that every folder of tests shares."""

import os
from pathlib import Path

import pytest

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
