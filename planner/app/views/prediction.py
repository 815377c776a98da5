"""Prediction: reverberation time by every formula, modes, and what they rest on."""

from __future__ import annotations

import streamlit as st

from planner.app import cached, show
from planner.app.main import current
from planner.bands import OCTAVES, band_label
from planner.predict.room_modes import RoomModes
from planner.report import charts

work = current()
st.title("Prediction")
prediction = cached.prediction(work)
if work.use_measured:
    st.info("The room as its measurement corrects it.")

st.header("Reverberation time")
for line in prediction.verdicts:
    st.markdown(show.plain(line))
left, right = st.columns(2, gap="large")
with left:
    show.chart(
        charts.reverberation(
            [
                show.prediction_series(
                    prediction,
                    "Eyring" if prediction.formula == "eyring" else "Sabine",
                    "untreated",
                )
            ],
            prediction.target,
            title="Against the target",
        ),
        key="prediction-target",
    )
with right:
    spread = charts.formula_range(
        prediction.methods, prediction.formula, assumed_hz=prediction.assumed_hz
    )
    show.chart(
        charts.reverberation([spread], prediction.target, title="Between the formulas"),
        key="prediction-range",
        table=False,
    )
    import pandas as pd

    with st.expander("Numbers: every formula"):
        st.dataframe(
            pd.DataFrame(
                {
                    name.replace("_", " "): [f"{t:.2f}" for t in times]
                    for name, times in prediction.methods.items()
                },
                index=[band_label(hz) for hz in OCTAVES],
            ).T,
            width="stretch",
        )
        st.caption("Reverberation time per octave band (s).")
if prediction.target is not None:
    st.caption(
        show.plain(f"Target: {prediction.target.description} ({prediction.target.citation}).")
    )

with st.expander("What the interval comes from"):
    rows = {
        name: [f"{100 * value:.0f}" for value in share]
        for name, share in prediction.contributions.items()
    }
    shares = pd.DataFrame.from_dict(
        rows, orient="index", columns=[band_label(hz) for hz in OCTAVES]
    )
    st.dataframe(shares, width="stretch")
    st.caption("Share of each uncertain input in the variance, per octave band (%).")
show.notes(prediction.warnings)


def proportions(found: RoomModes) -> None:
    """Published criteria, held or not, in words."""
    if not found.criteria:
        return
    st.subheader("Proportions, by published criteria")
    for one in found.criteria:
        verdict = ":material/check: Holds" if one.holds else ":material/close: Does not hold"
        st.markdown(
            f"**{verdict}** – {show.plain(one.name)}: {show.plain(one.numbers)}  \n"
            f":small[{show.plain(one.source)}]"
        )
    if found.rating is not None:
        st.markdown(show.plain(f"This room: {found.rating.reason}."))


def plan_of_mode(found: RoomModes) -> None:
    """Where in plan one mode is loud."""
    modes = found.modes
    if not len(modes.hz):
        return
    st.subheader("One mode in plan")
    number = st.selectbox(
        "Mode",
        range(len(modes.hz)),
        format_func=lambda n: f"{modes.hz[n]:.1f} Hz, {modes.kinds[n]}, {modes.labels[n]}",
        key=f"mode-{work.serial}-{len(modes.hz)}",
    )
    plan = show.guarded(lambda: cached.mode_plan(work, found.highest_hz, number))
    if plan is None:
        return
    positions = work.room.positions
    show.chart(
        charts.mode_pressure(
            plan.x,
            plan.y,
            plan.pressure,
            outline=work.room.footprint,
            seat=positions.seat,
            loudspeakers=positions.loudspeakers,
            title=f"Pressure at {modes.hz[number]:.1f} Hz",
            width=270,
        ),
        key="mode-plan",
        to_scale=True,
    )


st.header("Modes")
highest = st.slider("Up to (Hz)", 60, 300, 150, 10, key=f"modes-{work.serial}")
found = show.guarded(lambda: cached.modes(work, float(highest)))
if found is not None:
    show.chart(
        charts.modes(
            found.modes.hz, found.modes.kinds, found.modes.labels, schroeder_hz=found.schroeder_hz
        ),
        key="modes",
    )
    left, right = st.columns(2, gap="large")
    with left:
        show.chart(charts.mode_count(found.bands_hz, found.count), key="mode-count")
        proportions(found)
    with right:
        plan_of_mode(found)
    show.notes(found.warnings, "About the modes")


def at_the_seat() -> None:
    """Response in the bass, and what reaches the ear right after the direct sound."""
    found = show.guarded(lambda: cached.seat(work))
    if found is None:
        return
    shown = found.responses[-3:]
    show.chart(
        charts.response(
            shown[0].hz,
            [(one.name, one.level_db) for one in shown],
            title="Bass at the seat",
            reference="the free field at one metre",
        ),
        key="seat-response",
    )
    for one in shown:
        st.markdown(f"- {show.plain(one.name.capitalize())}: {one.unevenness_db:.1f} dB uneven.")
    rows = [
        {
            "loudspeaker": name.removeprefix("loudspeaker "),
            "by": ", ".join(one.surfaces),
            "later by (ms)": f"{1000 * one.delay:.1f}",
            "level, 1–8 kHz (dB)": f"{one.judged_db:.1f}".replace("-", "−"),
            "verdict": "too strong" if one.is_early_and_strong else "weak or late enough",
        }
        for name, one in found.reflections
        if one.order == 1
    ]
    st.subheader("First reflections")
    st.dataframe(pd.DataFrame(rows), hide_index=True, width="stretch")
    st.caption(
        "Against the direct sound: 10 dB down within 15 ms is wanted (ITU-R BS.1116, from memory)."
    )
    show.notes(found.warnings, "About the seat")


st.header("At the seat")
if work.room.positions.seat is None or not work.room.positions.loudspeakers:
    st.info("Give a seat and loudspeakers on the page Room to see the bass there.")
elif st.toggle("Show the bass and the first reflections at the seat", key=f"seat-{work.serial}"):
    at_the_seat()
