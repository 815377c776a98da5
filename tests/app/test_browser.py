"""The whole loop in a real browser, as a person would go through it."""

import os
import shutil
import socket
import subprocess
import sys
import time
import urllib.request
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
AXE = ROOT / ".axe" / "axe.min.js"
PAGES = {
    "": "Room", "prediction": "Prediction", "recordings": "Recordings", "reality": "Reality",
    "treatment": "Treatment", "shopping-list": "Shopping list", "projects": "Projects",
}  # fmt: skip
FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]

pytestmark = pytest.mark.browser


def chromium():
    for name in ("chromium", "chromium-browser", "google-chrome"):
        if found := shutil.which(name):
            return found
    if os.environ.get("CI"):
        pytest.fail("continuous integration installs Chromium, but there is none")
    pytest.skip("there is no Chromium on this machine")


@pytest.fixture(scope="module")
def browser():
    path = chromium()
    api = pytest.importorskip("playwright.sync_api")
    with api.sync_playwright() as play:
        found = play.chromium.launch(executable_path=path, args=FLAGS)
        yield found
        found.close()


def free_port():
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return probe.getsockname()[1]


def serve(folder):
    """The app on a free port of this computer, and its address."""
    port = free_port()
    words = [sys.executable, "-m", "planner", "app", "--port", str(port), "--no-browser"]
    process = subprocess.Popen(
        [*words, str(folder)],
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        start_new_session=True,
    )
    address = f"http://127.0.0.1:{port}"
    for _ in range(200):
        try:
            urllib.request.urlopen(f"{address}/_stcore/health", timeout=1).read()
            return process, address
        except OSError:
            time.sleep(0.2)
    process.kill()
    raise RuntimeError("the app did not start")


@pytest.fixture
def page(browser, tmp_path, request):
    """A page of the app on an empty folder, with everything it asked for and complained about."""
    folder = tmp_path / "new-room"
    folder.mkdir()
    process, address = serve(folder)
    context = browser.new_context(viewport={"width": 1280, "height": 1000}, accept_downloads=True)
    found = context.new_page()
    found.errors, found.hosts, found.folder, found.address = [], set(), folder, address
    found.on("console", lambda m: found.errors.append(m.text) if m.type == "error" else None)
    found.on("pageerror", lambda error: found.errors.append(str(error)))
    found.on(
        "request",
        lambda r: found.hosts.add(r.url.split("/")[2]) if r.url.startswith("http") else None,
    )
    yield found
    context.close()
    os.killpg(process.pid, 15)
    process.wait(timeout=20)


def go(page, name):
    """A page, by its link at the top as a person would, ready to be looked at."""
    page.get_by_role("link", name=name, exact=True).first.click()
    page.get_by_role("heading", name=name, level=1).wait_for(timeout=30_000)
    settle(page)


def settle(page):
    """Wait until the script has run."""
    page.wait_for_timeout(400)
    page.wait_for_function(
        "!document.querySelector('[data-testid=stStatusWidget]') && !document.querySelector('.stSpinner')",
        timeout=90_000,
    )
    page.wait_for_timeout(400)


def fill(page, label, text):
    box = page.get_by_label(label, exact=True)
    box.fill(text)
    box.press("Enter")
    settle(page)


def picture(page, path, width):
    """The whole page: it scrolls inside the window, so that the window is made as high as it is."""
    inner = "document.querySelector('[data-testid=stMain]').scrollHeight"
    page.set_viewport_size({"width": width, "height": min(int(page.evaluate(inner)) + 40, 6000)})
    page.wait_for_timeout(600)
    page.screenshot(path=str(path))
    page.set_viewport_size({"width": width, "height": 900})


def serious(page):
    """Faults that axe-core calls serious or critical."""
    page.add_script_tag(path=str(AXE))
    result = page.evaluate("axe.run(document, {resultTypes: ['violations']})")
    return [
        f"{one['id']}: {one['nodes'][0]['html'][:160]}"
        for one in result["violations"]
        if one["impact"] in ("serious", "critical")
    ]


def test_the_whole_loop(page, demo_project):
    """Sketch → predict → upload → calibrate → suggest → edit → compare → download → reload: all is there."""
    page.goto(page.address)
    page.get_by_role("heading", name="Room", level=1).wait_for(timeout=60_000)
    settle(page)
    fill(page, "Name", "Attic for the quartet")
    fill(page, "Length (m)", "5.20")
    fill(page, "Width (m)", "3.90")
    assert page.get_by_text("Volume 52.7 m³").is_visible()
    fill(page, "Height (m)", "two")
    assert page.get_by_text("is not a length").first.is_visible()
    fill(page, "Height (m)", "2.6")

    go(page, "Prediction")
    assert page.locator("canvas, svg.marks, .vega-embed").first.is_visible()

    go(page, "Recordings")
    files = [demo_project / "recordings" / name for name in ("A1.flac", "B2.flac")]
    page.locator("input[type=file]").first.set_input_files([str(path) for path in files])
    settle(page)
    page.get_by_role("button", name="Evaluate recordings").click()
    page.get_by_role("heading", name="Measured reverberation time").wait_for(timeout=90_000)
    settle(page)

    go(page, "Reality")
    page.get_by_text("Use the corrected room from here on").click()
    settle(page)

    go(page, "Treatment")
    page.get_by_role("button", name="Suggest the cheapest treatment").click()
    page.get_by_role("heading", name="Edit Suggestion 1").wait_for(timeout=120_000)
    settle(page)
    page.get_by_role("button", name="Copy", exact=True).click()
    page.get_by_role("heading", name="Edit Suggestion 1 1").wait_for(timeout=60_000)
    settle(page)
    assert len(list((page.folder / "options").glob("*.toml"))) == 2

    go(page, "Shopping list")
    with page.expect_download(timeout=60_000) as download:
        page.get_by_role("button", name="List (PDF)").click()
    assert Path(download.value.path()).read_bytes().startswith(b"%PDF")

    page.goto(page.url.split("/shopping")[0] + "/?" + page.url.split("?", 1)[1])
    page.get_by_role("heading", name="Room", level=1).wait_for(timeout=60_000)
    settle(page)
    assert page.get_by_label("Name", exact=True).input_value() == "Attic for the quartet"
    go(page, "Treatment")
    assert page.get_by_text("For the room as its measurement corrects it.").is_visible()
    assert page.get_by_text("Suggestion 1 1").first.is_visible()

    # The server itself looks for its own address below the page's at first; nothing else may fail.
    assert [text for text in page.errors if "404" not in text] == []
    assert {host.split(":")[0] for host in page.hosts} <= {"127.0.0.1", "localhost"}


def test_the_first_visit_may_be_to_any_page(page):
    """A bookmark of a fresh server: the page stands under its links and its project's name."""
    page.goto(f"{page.address}/shopping-list")
    page.get_by_role("heading", name="Shopping list", level=1).wait_for(timeout=60_000)
    assert page.get_by_role("link", name="Projects", exact=True).first.is_visible()
    assert page.get_by_text("every change is saved at once").is_visible()


@pytest.mark.parametrize(("width", "scheme"), [(1280, "light"), (390, "dark")])
def test_every_page_is_usable_and_accessible(browser, demo_project, tmp_path, width, scheme):
    """No serious fault by axe-core, nothing wider than the screen, a picture of each page kept to look at."""
    if not AXE.is_file():
        if os.environ.get("CI"):
            pytest.fail("tests/app/axe.sh was to fetch axe-core")
        pytest.skip("axe-core is not here: run tests/app/axe.sh")
    place = tmp_path / "net-loft"
    shutil.copytree(demo_project, place)
    process, address = serve(place)
    try:
        context = browser.new_context(viewport={"width": width, "height": 900}, color_scheme=scheme)
        page = context.new_page()
        faults = {}
        for path, title in PAGES.items():
            page.goto(f"{address}/{path}")
            page.get_by_role("heading", name=title, level=1).wait_for(timeout=60_000)
            settle(page)
            picture(page, tmp_path / f"{width}-{path or 'room'}.png", width)
            wide = page.evaluate("document.documentElement.scrollWidth") - width
            faults[title] = serious(page) + ([f"{wide} px too wide"] if wide > 1 else [])
        context.close()
    finally:
        os.killpg(process.pid, 15)
        process.wait(timeout=20)
    assert {title: found for title, found in faults.items() if found} == {}
