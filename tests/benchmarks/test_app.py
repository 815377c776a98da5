"""How long a person waits for the browser app, against a page of Streamlit that does nothing.

Run with ``pytest tests/benchmarks/test_app.py -m benchmark --benchmark-enable -s``.
"""

import importlib.util
import os
import shutil
import signal
import statistics
import subprocess
import sys
import time
from pathlib import Path

import pytest

pytestmark = [
    pytest.mark.benchmark,
    pytest.mark.filterwarnings("ignore::DeprecationWarning", "ignore::ResourceWarning"),
]

BROWSER = Path(__file__).parents[1] / "app" / "test_browser.py"
TRIVIAL = """
import streamlit as st
st.set_page_config(page_title="Trivial", layout="wide")
st.title("Trivial")
text = st.text_input("Length (m)", value="5.2")
st.caption(f"Length is {text}")
"""
LENGTHS = ("5.3", "5.4", "5.5", "5.6", "5.7", "5.8", "5.9", "6.1", "6.2")


@pytest.fixture(scope="module")
def tools():
    spec = importlib.util.spec_from_file_location("browser_tools", BROWSER)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="module")
def window(tools):
    path = tools.chromium()
    api = pytest.importorskip("playwright.sync_api")
    with api.sync_playwright() as play:
        browser = play.chromium.launch(executable_path=path, args=tools.FLAGS)
        yield browser.new_page(viewport={"width": 1280, "height": 1000})
        browser.close()


def first_page(window, command, port, ready):
    """Start a server and open its page: process and seconds until it can be used."""
    start = time.perf_counter()
    process = subprocess.Popen(
        command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, start_new_session=True
    )
    while time.perf_counter() - start < 60:
        try:
            window.goto(f"http://127.0.0.1:{port}")
            break
        except Exception:  # not listening yet
            time.sleep(0.05)
    ready(window)
    return process, time.perf_counter() - start


def redraws(window, words):
    """Median time from Enter to the changed number on the page. [s]."""
    box = window.get_by_label("Length (m)", exact=True)
    times = []
    for length in LENGTHS:
        box.fill(length)
        start = time.perf_counter()
        box.press("Enter")
        window.get_by_text(words(length)).wait_for(timeout=20_000)
        times.append(time.perf_counter() - start)
        window.wait_for_timeout(300)
    return statistics.median(times[2:])


def stop(process):
    os.killpg(process.pid, signal.SIGTERM)
    process.wait(timeout=20)


def test_a_dimension_redraws_in_one_and_a_half_trivial_reruns(
    tools, window, demo_project, tmp_path
):
    """Volume of 3.90 · 2.60 m times the length is what must appear: the right answer, by hand."""
    script = tmp_path / "trivial.py"
    script.write_text(TRIVIAL)
    project = tmp_path / "net-loft"
    shutil.copytree(demo_project, project)
    port = tools.free_port()
    flags = ["--server.headless", "true", "--browser.gatherUsageStats", "false"]
    trivial, trivial_start = first_page(
        window,
        [sys.executable, "-m", "streamlit", "run", str(script), "--server.port", str(port), *flags],
        port,
        lambda page: page.get_by_text("Length is 5.2").wait_for(timeout=60_000),
    )
    try:
        trivial_redraw = redraws(window, lambda length: f"Length is {length}")
    finally:
        stop(trivial)
    port = tools.free_port()
    words = [sys.executable, "-m", "planner", "app", str(project)]
    ours, our_start = first_page(
        window,
        [*words, "--port", str(port), "--no-browser"],
        port,
        lambda page: page.get_by_text("Volume 52.7 m³").wait_for(timeout=60_000),
    )
    try:
        our_redraw = redraws(window, lambda length: f"Volume {float(length) * 3.9 * 2.6:.1f} m³")
    finally:
        stop(ours)
    print(
        f"\nA changed length redraws in {our_redraw / trivial_redraw:.2f} trivial reruns "
        f"({1000 * our_redraw:.0f} ms against {1000 * trivial_redraw:.0f} ms); the first page stands "
        f"after {our_start / trivial_start:.2f} trivial cold starts ({our_start:.1f} s against "
        f"{trivial_start:.1f} s)"
    )
    assert our_start < 4 * trivial_start
    assert our_redraw < 4 * trivial_redraw
