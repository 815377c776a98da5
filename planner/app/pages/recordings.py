"""Recordings: the test signal, the files from the site, and what they give."""

from __future__ import annotations

import io
from pathlib import Path
from typing import Any

import numpy as np
import streamlit as st

from planner.app import show
from planner.app.main import current
from planner.app.work import file_name
from planner.errors import PlannerError
from planner.measure.measurement import SOUND, measure
from planner.measure.noise import cue_sheet, lengths_for, noise_signal
from planner.report import charts
from planner.storage import write_atomically

work = current()
folder = work.folder / "recordings"
st.title("Recordings")


def signal_download() -> None:
    """The test signal for this room, and its cue sheet."""
    from planner.app import cached

    prediction = cached.prediction(work, calibrated=False)
    finite = np.where(np.isfinite(prediction.time), prediction.time, 0.0)
    burst, silence = lengths_for(float(finite.max()))
    left, middle, right = st.columns(3)
    bursts = int(left.number_input("Bursts", 1, 20, 4, key="signal-bursts"))
    burst = float(middle.number_input("Noise (s)", 1.0, 30.0, burst, 0.5, key="signal-burst"))
    silence = float(
        right.number_input("Silence (s)", 0.5, 30.0, silence, 0.5, key="signal-silence")
    )

    def sound() -> bytes:
        import soundfile

        signal = noise_signal(bursts=bursts, burst_s=burst, silence_s=silence)
        buffer = io.BytesIO()
        soundfile.write(buffer, signal.pressure, signal.rate_hz, format="WAV", subtype="PCM_24")
        return buffer.getvalue()

    def sheet() -> str:
        signal = noise_signal(bursts=bursts, burst_s=burst, silence_s=silence)
        return cue_sheet(
            signal,
            file="pink.wav",
            room=work.room.name,
            volume=prediction.volume_m3,
            expected_s=prediction.time,
        )

    one, two = st.columns(2)
    one.download_button(
        "Test signal (WAV)", sound, "pink.wav", "audio/wav", on_click="ignore", key="signal-wav"
    )
    two.download_button(
        "Cue sheet (text)", sheet, "pink.txt", "text/plain", on_click="ignore", key="signal-sheet"
    )
    st.warning(
        "Loud noise harms: wear ear protection or leave the room while it plays, start low, warn neighbours."
    )


with st.expander("Test signal to play on site", expanded=work.measured is None):
    signal_download()

st.header("Files")
uploads = st.file_uploader(
    "Recordings from the site (WAV, FLAC, AIFF …)",
    type=[ending.lstrip(".") for ending in SOUND] + ["csv"],
    accept_multiple_files=True,
    key=f"uploads-{work.serial}-{st.session_state.get('uploaded', 0)}",
    help="They are kept in the folder recordings of this project. survey.csv says which position each is; "
    "else the names do: A2.wav is source A, microphone 2.",
)
if uploads:
    for one in uploads:
        suffix = Path(one.name).suffix.lower()
        name = (
            "survey.csv"
            if one.name.lower() == "survey.csv"
            else f"{file_name(Path(one.name).stem)}{suffix}"
        )
        write_atomically(folder / name, one.getvalue())
    st.session_state["uploaded"] = st.session_state.get("uploaded", 0) + 1
    st.rerun()

present = (
    sorted(p for p in folder.glob("*") if p.suffix.lower() in SOUND) if folder.is_dir() else []
)
if not present:
    st.info(f"No recordings are in {work.folder.name}/recordings yet: drop some above.")
chosen = st.multiselect(
    "Evaluate", [p.name for p in present], default=[p.name for p in present],
    key=f"chosen-{work.serial}-{len(present)}",
)  # fmt: skip
left, middle, right = st.columns(3)
impulse = left.checkbox("They hold claps, balloons or impulse responses", key="impulse")
thirds = middle.checkbox("One-third octaves", key="thirds")
state = right.selectbox(
    "State of the room", ["as in survey.csv", "empty", "furnished", "occupied"], key="state"
)

if st.button("Evaluate recordings", type="primary", disabled=not chosen, key="evaluate"):
    bar = st.progress(0.0, "Reading …")

    def tell(done: int, total: int) -> None:
        """Move the bar."""
        bar.progress(done / total, f"{done} of {total} recordings")

    try:
        result = measure(
            [folder / name for name in chosen],
            impulse=impulse,
            thirds=thirds,
            air=work.room.air_state(),
            state="" if state.startswith("as") else state,
            progress=tell,
        )
        work.set_measured(result)
        work.use_measured = False
    except PlannerError as error:
        show.refusal(error)
    finally:
        bar.empty()


def results() -> None:
    """The room average, and the decays it rests on."""
    measured = work.measured
    assert measured is not None
    st.header("Measured reverberation time")
    octaves = len(measured.bands_hz) <= 12
    if octaves:
        from planner.reconcile.octaves import octave_times

        times = octave_times(measured)
        series = charts.Series(
            "Measured",
            times.t_s,
            "measured",
            low=times.t_s - 2 * times.u_s,
            high=times.t_s + 2 * times.u_s,
        )
        show.chart(
            charts.reverberation([series], work.project.target, title="Measured"),
            key="measured",
            table=False,
        )
    st.dataframe(table(measured), hide_index=True, width="stretch")
    facts = [
        f"{max(measured.positions, default=0)} positions, {max(measured.decays, default=0)} decays"
    ]
    if measured.grade:
        facts.append(f"{measured.grade} method of ISO 3382-2")
    if measured.state:
        facts.append(f"room {measured.state}")
    st.caption(" · ".join(facts))
    show.notes(
        [
            *measured.warnings,
            *(f"{note.file}: {text}" for note in measured.recordings for text in note.warnings),
        ],
        "Findings and their cures",
    )
    if work.measurement is not None:
        decays()


def table(measured: Any) -> Any:
    """Every band in words and numbers."""
    import pandas as pd

    def shown(value: float, digits: int = 2) -> str:
        return f"{value:.{digits}f}" if np.isfinite(value) else "–"

    return pd.DataFrame(
        [
            {
                "band (Hz)": f"{hz:g}",
                "T (s)": shown(measured.t_s[n]),
                "± 95 % (s)": shown(2 * measured.u_s[n]),
                "from": measured.evaluation[n] or "refused",
                "T20 (s)": shown(measured.t20_s[n]),
                "T30 (s)": shown(measured.t30_s[n]),
                "EDT (s)": shown(measured.edt_s[n]),
                "range (dB)": shown(measured.range_db[n], 0),
                "doubts": "; ".join(measured.flags[n]),
            }
            for n, hz in enumerate(measured.bands_hz)
        ]
    )


def decays() -> None:
    """One decay curve with its evaluated range, floor and fit."""
    from planner.report.joins import decay_picture

    assert work.measurement is not None
    st.header("Decays")
    pairs = list(work.measurement.positions)
    left, right = st.columns(2)
    pair = left.selectbox(
        "Position",
        pairs,
        format_func=lambda p: f"source {p[0]}, microphone {p[1]}",
        key="decay-pair",
    )
    each = work.measurement.positions[pair].each
    number = right.selectbox(
        "Band", range(len(each)), index=min(4, len(each) - 1), format_func=lambda n: f"{each[n].band_hz:g} Hz",
        key=f"decay-band-{len(each)}",
    )  # fmt: skip
    band = each[number]
    if len(band.curve.time_s):
        show.chart(charts.decay(decay_picture(band)), key="decay", table=False)
    st.markdown(show.plain(band.reason or "evaluated"))


if work.measured is not None:
    results()
