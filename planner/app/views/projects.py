"""Projects: open, begin, keep, send, and an invented example."""

from __future__ import annotations

from pathlib import Path

import streamlit as st

from planner.app import show
from planner.app.archive import packed, unpack
from planner.app.main import current, next_serial, show_work
from planner.app.work import drafts, file_name, new_draft, new_work, open_work
from planner.errors import PlannerError, ProjectError

work = current()
st.title("Projects")
st.markdown(f"Open: **{show.plain(work.room.name)}**")
st.caption(f"Kept in {show.plain(str(work.folder))}: every change is saved there at once.")


def opened(folder: Path) -> None:
    """Open a folder, or say why not."""
    try:
        if not (folder / "room.toml").is_file():
            raise ProjectError("holds no room.toml", file=folder, cure="Choose a project folder.")
        found, notes = open_work(folder, next_serial())
    except (PlannerError, OSError) as error:
        st.error(show.plain(str(error)))
        return
    show_work(found, notes)
    st.rerun()


left, right = st.columns(2, gap="large")
with left:
    st.header("Begin")
    if st.button("New room", key="new"):
        show_work(new_work(new_draft(), next_serial()))
        st.rerun()
    if st.button("Invented example with recordings", key="demo"):
        with st.spinner("Making an invented room and recordings of it …"):
            from planner.demo import write_project

            place = new_draft() / "net-loft"
            write_project(place)
        opened(place)
    st.header("Open")
    named = st.text_input(
        "Folder on this computer", key="open-folder", placeholder="/home/me/rooms/net-loft"
    )
    if st.button("Open folder", key="open", disabled=not named.strip()):
        opened(Path(named.strip()).expanduser())
    kept = [p for p in drafts().glob("*/**/room.toml") if p.parent != work.folder][:20]
    if kept:
        choice = st.selectbox(
            "Drafts", kept, format_func=lambda p: f"{p.parent.name}", key="draft", index=None
        )
        if choice is not None and st.button("Open draft", key="open-draft"):
            opened(choice.parent)
    upload = st.file_uploader("Project as zip", type=["zip"], key=f"zip-{work.serial}")
    if upload is not None and st.button("Open zip", key="open-zip"):
        try:
            place = new_draft()
            unpack(upload.getvalue(), place)
            opened(place)
        except PlannerError as error:
            show.refusal(error)

with right:
    st.header("Keep")
    where = st.text_input(
        "Copy it into the folder", key="keep-folder", placeholder="/home/me/rooms/my-room"
    )
    if st.button("Keep there", key="keep", disabled=not where.strip()):
        target = Path(where.strip()).expanduser()
        try:
            if target.exists() and (not target.is_dir() or any(target.iterdir())):
                raise ProjectError(
                    "is not empty", file=target, cure="Name a new folder: nothing is overwritten."
                )
            unpack(packed(work.folder), target)
            opened(target)
        except PlannerError as error:
            show.refusal(error)
    st.header("Send")
    with_sound = st.checkbox("With recordings", value=True, key="with-sound")
    st.download_button(
        "Download as zip", lambda: packed(work.folder, recordings=with_sound),
        f"{file_name(work.room.name) or 'project'}.zip", "application/zip", on_click="ignore", key="zip-download",
    )  # fmt: skip
