"""How fast the commands answer, against what Python itself needs.

``pytest tests/benchmarks/test_start.py -m benchmark -s`` prints the ratios.
"""

import subprocess
import sys
import time

import pytest

pytestmark = pytest.mark.benchmark


def best(command, repeats=7):
    """Shortest of several runs. [s]"""
    times = []
    for _ in range(repeats):
        began = time.perf_counter()
        subprocess.run(command, check=True, capture_output=True)
        times.append(time.perf_counter() - began)
    return min(times)


def test_help_against_importing_numpy():
    """`planner --help` within twice `python -c "import numpy"`."""
    numpy = best([sys.executable, "-c", "import numpy"])
    ours = best([sys.executable, "-m", "planner", "--help"])
    print(
        f"\nplanner --help: {ours / numpy:.2f} × importing numpy (aim 2); {ours:.2f} s and {numpy:.2f} s"
    )
    assert (
        subprocess.run([sys.executable, "-m", "planner", "--help"], capture_output=True).returncode
        == 0
    )
