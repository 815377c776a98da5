"""Treatment: limits and products, the proven suggestion, options side by side, edits by hand."""

from __future__ import annotations

import streamlit as st

from planner.app import limits, options, show
from planner.app.main import current

work = current()
st.title("Treatment")
st.caption(
    "For the room as its measurement corrects it."
    if work.use_measured
    else "For the room as described."
)
with st.expander("Limits"):
    limits.limits(work)
with st.expander("Products"):
    limits.products(work)
if show.guarded(lambda: work.project.catalogue) is None:
    st.stop()
if work.project.target is None:
    st.info("Choose a target on the page Room first.")
    st.stop()
st.header("Suggestion")
options.suggest(work)
if not work.options:
    st.stop()
st.header("Options")
options.manage(work)
if work.option is not None:
    options.edit(work, work.option)
st.header("Side by side")
options.compare(work)
