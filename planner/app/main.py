"""The app: which project is open, which pages there are, and what stands above every page."""

from __future__ import annotations

import os
from pathlib import Path

import streamlit as st

from planner.app.launch import FOLDER_VARIABLE
from planner.app.show import plain, refusal, theme
from planner.app.work import Work, drafts, new_draft, new_work, open_work
from planner.errors import PlannerError
from planner.report.palette import DARK

KEY = "work"
"""Under this key the session keeps its one project."""

QUERY = "project"
"""Part of the address that names the folder, so that a reload finds it again."""

PAGES = (
    ("room.py", "Room", ":material/square_foot:"),
    ("prediction.py", "Prediction", ":material/show_chart:"),
    ("recordings.py", "Recordings", ":material/mic:"),
    ("reality.py", "Reality", ":material/compare_arrows:"),
    ("treatment.py", "Treatment", ":material/grid_view:"),
    ("shopping.py", "Shopping list", ":material/shopping_cart:"),
    ("projects.py", "Projects", ":material/folder_open:"),
)


STYLE = """<style>
[data-testid="stMainBlockContainer"] { padding-top: 4.5rem; padding-bottom: 4rem; }
[data-testid="stCaptionContainer"], [data-testid="stCaptionContainer"] p { color: inherit; }
[data-testid="stCaptionContainer"] { opacity: 0.85; }
h1 { font-size: 2rem !important; padding: 0.25rem 0 0.5rem !important; }
h2 { font-size: 1.45rem !important; }
h3 { font-size: 1.2rem !important; }
</style>"""
"""Less empty space and smaller headings than usual; small print dark enough to read (4.5 : 1)."""

DARK_STYLE = """<style>
[data-testid="stBaseButton-primary"] p, [data-tag], [data-tag] * { color: #0e1117; }
</style>"""
"""White on the pale accent of the dark page could not be read."""


def main() -> None:
    """One run of the app."""
    st.set_page_config(
        page_title="Room treatment planner",
        # A file of our own: the icon of a page would be fetched from another host.
        page_icon=str(Path(__file__).with_name("icon.png")),
        layout="wide",
    )
    # Not called "pages": Streamlit would show files of that folder by itself, without what follows.
    folder = Path(__file__).parent / "views"
    pages = [
        st.Page(
            folder / name,
            title=title,
            icon=icon,
            default=number == 0,
            url_path=title.lower().replace(" ", "-"),
        )
        for number, (name, title, icon) in enumerate(PAGES)
    ]
    page = st.navigation(pages, position="top")
    st.html(STYLE)
    if theme() is DARK:
        st.html(DARK_STYLE)
    work = current()
    st.query_params[QUERY] = str(work.folder)
    asked = work.conflict
    _header(work)
    try:
        page.run()
        current().remember()
    except PlannerError as error:
        # Pages show refusals beside their cause; what reaches this (a full disk, a folder that
        # was deleted meanwhile) concerns the whole page.
        refusal(error)
    if current().conflict != asked:
        st.rerun()  # the question stands above the page


def current() -> Work:
    """The project of this session; the first run opens one."""
    if KEY not in st.session_state:
        work, notes = _first()
        st.session_state[KEY] = work
        st.session_state["notes"] = notes
    found: Work = st.session_state[KEY]
    return found


def show_work(work: Work, notes: list[str] | None = None) -> None:
    """Put another project in place of the open one."""
    st.session_state[KEY] = work
    st.session_state["notes"] = notes or []
    st.query_params[QUERY] = str(work.folder)


def next_serial() -> int:
    """A number that no project of this session has had."""
    st.session_state["serial"] = int(st.session_state.get("serial", 0)) + 1
    return int(st.session_state["serial"])


def _first() -> tuple[Work, list[str]]:
    """The folder named by the address or the command, or a new sketch."""
    named = st.query_params.get(QUERY) or os.environ.get(FOLDER_VARIABLE)
    if named:
        folder = Path(named)
        try:
            if (folder / "room.toml").is_file():
                return open_work(folder, next_serial())
            # An address may open what is there; only the command may begin something in a folder.
            if QUERY not in st.query_params and folder.is_dir() and not any(folder.iterdir()):
                return new_work(folder, next_serial()), []
            note = f"{folder.name} holds no room.toml: a new sketch was begun instead."
        except PlannerError as error:
            note = f"{error} A new sketch was begun instead."
        return new_work(new_draft(), next_serial()), [note]
    return new_work(new_draft(), next_serial()), []


def _header(work: Work) -> None:
    """Name of the project, where it is kept, and anything that needs a decision."""
    where = "a draft" if work.folder.parent == drafts() else f"kept in {plain(work.folder.name)}"
    st.caption(f"**{plain(work.room.name)}** · {where}; every change is saved at once")
    for note in st.session_state.get("notes", []):
        st.warning(plain(note))
    if work.conflict:
        _conflict(work)


def _conflict(work: Work) -> None:
    """Ask whose version of a file is to stay."""
    st.error(
        f"{plain(work.conflict or '')} was changed by someone else meanwhile. Nothing was "
        "overwritten: which one is to stay?"
    )
    with st.container(horizontal=True):
        theirs = st.button("Take theirs", key="take-theirs")
        mine = st.button("Keep mine", key="keep-mine")
    try:
        if theirs:
            show_work(*open_work(work.folder, next_serial()))
            st.rerun()
        if mine:
            work.overwrite()
            st.rerun()
    except PlannerError as error:
        refusal(error)
