"""The demo project under a short name."""

import pytest


@pytest.fixture(scope="session")
def demo(demo_project):
    """The invented project after its own loop."""
    return demo_project
