"""Reality: predicted against measured, and the coefficients that explain the gap."""

from __future__ import annotations

import pandas as pd
import streamlit as st

from planner.app import cached, show
from planner.app.main import current
from planner.report import charts
from planner.report.joins import calibrated_rows

work = current()
st.title("Reality")
if work.measured is None:
    st.info(
        "Nothing is measured yet. Evaluate recordings first, or put a measured.csv into the project."
    )
    st.stop()

comparison = show.guarded(lambda: cached.comparison(work))
if comparison is None:
    st.stop()

prediction = cached.prediction(work, calibrated=False)
measured = charts.Series(
    "Measured", comparison.measured, "measured",
    low=comparison.measured - 2 * comparison.measured_u, high=comparison.measured + 2 * comparison.measured_u,
)  # fmt: skip
show.chart(
    charts.measured_against_predicted(
        show.prediction_series(prediction, "Predicted", "untreated"), measured, prediction.target
    ),
    key="reality",
)
for line in comparison.words:
    st.markdown(show.plain(line))
show.notes(comparison.warnings)

st.header("What explains the difference")
calibration = comparison.calibration
if calibration is None:
    st.info("No coefficients can be corrected by this measurement: see the doubts above.")
    st.stop()
for line in calibration.words:
    st.markdown(f"- {show.plain(line)}")
rows = calibrated_rows(calibration)
if rows:
    st.dataframe(
        pd.DataFrame(rows, columns=["material", "band", "assumed", "fits the measurement"]),
        hide_index=True, width="stretch",
    )  # fmt: skip
    st.caption("Coefficients with their standard uncertainty, where the measurement can tell.")

work.use_measured = st.toggle(
    "Use the corrected room from here on (prediction, treatment, list)",
    value=work.use_measured, key=f"use-measured-{work.serial}",
)  # fmt: skip
st.caption(
    "The room file keeps the table's coefficients; the correction can be taken back at any time."
)
