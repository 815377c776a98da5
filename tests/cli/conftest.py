"""A demo project that all command tests share; none of them changes it."""

import contextlib
import io

import pytest

from planner.cli import main


@pytest.fixture(scope="session")
def demo(tmp_path_factory):
    """The invented project after its own loop."""
    place = tmp_path_factory.mktemp("demo") / "net-loft"
    with contextlib.redirect_stdout(io.StringIO()), contextlib.redirect_stderr(io.StringIO()):
        assert main(["demo", str(place)]) == 0
    return place
