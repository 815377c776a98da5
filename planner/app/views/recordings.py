"""Recordings: the test signal, the files from the site, and what they give."""

from __future__ import annotations

import io
from typing import TYPE_CHECKING, Any

import numpy as np
import pandas as pd
import streamlit as st

from planner.app import show, survey
from planner.app.main import current
from planner.app.tables import HELD, cells, edited
from planner.app.work import SURVEY
from planner.bands import OCTAVES
from planner.errors import PlannerError
from planner.measure.figures import doubts_in_words
from planner.measure.measured import measured_to_csv
from planner.measure.measurement import SOUND
from planner.measure.noise import cue_sheet, lengths_for, noise_signal
from planner.measure.survey import KINDS, STATES
from planner.report import charts

if TYPE_CHECKING:
    from planner.measure.measurement import Measurement

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


def uploads() -> None:
    """Take what is dropped into the project's folder; nothing of it stays in memory."""
    dropped = st.file_uploader(
        "Recordings from the site (WAV, FLAC, AIFF …)",
        type=[ending.lstrip(".") for ending in SOUND] + ["csv"],
        accept_multiple_files=True,
        key=f"uploads-{work.serial}-{st.session_state.get('uploaded', 0)}",
        help="They are kept in the folder recordings of this project. survey.csv says which position "
        "each is; else the names do: A2.wav is source A, microphone 2.",
    )
    if dropped:
        said: list[tuple[bool, str]] = []
        for one in dropped:
            try:
                note = survey.take(work, one.name, one.getvalue())
                if note:
                    said.append((True, note))
            except PlannerError as error:
                said.append((False, f"{one.name}: not kept. {error}"))
        st.session_state["upload-notes"] = said
        st.session_state["uploaded"] = st.session_state.get("uploaded", 0) + 1
        st.rerun()
    for fine, text in st.session_state.get("upload-notes", []):
        (st.info if fine else st.error)(show.plain(text))


def positions(names: list[str]) -> None:
    """Which position each recording is; kept as survey.csv as soon as it holds."""
    with st.expander("Which position is which recording"):
        known = show.guarded(lambda: survey.places(work, names))
        if known is None:
            return
        base = pd.DataFrame(
            [
                {
                    "file": place.file,
                    "source_position": place.source,
                    "microphone_position": place.microphone,
                    "state": place.state,
                    "kind": place.kind,
                    "note": place.note,
                }
                for place in known.values()
            ],
            dtype=str,
        )
        key = f"survey-{work.serial}-{'|'.join(names)}"
        table = edited(
            base,
            key=key,
            num_rows="fixed",
            column_config={
                "file": st.column_config.TextColumn("Recording", disabled=True),
                "source_position": st.column_config.TextColumn("Source", required=True),
                "microphone_position": st.column_config.TextColumn("Microphone", required=True),
                "state": st.column_config.SelectboxColumn("Room was", options=["", *STATES]),
                "kind": st.column_config.SelectboxColumn("Kind", options=list(KINDS)),
                "note": st.column_config.TextColumn("Note"),
            },
        )
        typed = not table.equals(st.session_state[HELD][key])
        if cells(table) != cells(base) and (typed or work.is_mine(SURVEY)):
            text = show.guarded(lambda: survey.survey_text(cells(table)))
            if text is not None:
                work.save(SURVEY, text)
        st.caption(
            "Two sources and three microphone positions, two decays each, make the engineering "
            "method of ISO 3382-2 (from memory). Every change is kept at once."
        )


def evaluate(chosen: list[str]) -> None:
    """Evaluate the chosen recordings; the same ones are not worked out twice."""
    with st.container(horizontal=True, vertical_alignment="bottom"):
        impulse = st.checkbox("They hold claps, balloons or impulse responses", key="impulse")
        thirds = st.checkbox("One-third octaves", key="thirds")
        state = st.selectbox(
            "State of the room", ["as in the table above", *STATES], key="state", width=240
        )
    if not st.button("Evaluate recordings", type="primary", disabled=not chosen, key="evaluate"):
        return
    asked = {
        "files": chosen,
        "impulse": impulse,
        "thirds": thirds,
        "state": "" if state.startswith("as") else state,
    }
    result = asked_for(asked)
    if result is not None:
        if not is_the_same(result):
            work.use_measured = False  # another measurement is to be looked at before it counts
        work.set_measured(result)
        work.evaluated = asked


def asked_for(asked: dict[str, Any]) -> Measurement | None:
    """What the recordings give, or None after showing why they were refused."""
    bar = st.progress(0.0, "Reading …")

    def tell(done: int, total: int) -> None:
        """Move the bar."""
        bar.progress(done / total, f"{done} of {total} recordings")

    try:
        return survey.evaluated(
            work,
            [folder / name for name in asked["files"]],
            impulse=asked["impulse"],
            thirds=asked["thirds"],
            state=asked["state"],
            progress=tell,
        )
    except PlannerError as error:
        show.refusal(error)
        return None
    finally:
        bar.empty()


def is_the_same(result: Measurement) -> bool:
    """Does an evaluation say what the project's measurement says."""
    return work.measured is not None and measured_to_csv(work.measured) == measured_to_csv(
        result.measured
    )


def recall(bands: int) -> None:
    """Work the decays out again that a new session does not have, once."""
    tried = f"recalled-{work.serial}"
    asked = work.evaluated or {
        "files": present,
        "impulse": False,
        "thirds": bands > len(OCTAVES) + 2,
        "state": "",
    }
    if st.session_state.get(tried) != asked and set(asked["files"]) <= set(present):
        result = asked_for(asked)
        st.session_state[tried] = asked
        if result is not None and is_the_same(result):
            work.measurement = result
            return
    st.caption("Evaluate the recordings once more to look at their decays.")


uploads()
present = [p.name for p in sorted(folder.glob("*")) if p.suffix.lower() in SOUND]
if present:
    positions(present)
    evaluate(
        st.multiselect(
            "Evaluate", present, default=present, key=f"chosen-{work.serial}-{len(present)}"
        )
    )
else:
    st.info(f"No recordings are in {show.plain(work.folder.name)}/recordings yet: drop some above.")


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
    for words in doubts_in_words(measured.bands_hz, measured.flags):
        st.markdown(f"- {show.plain(words)}")
    show.notes(
        [
            *measured.warnings,
            *(f"{note.file}: {text}" for note in measured.recordings for text in note.warnings),
        ],
        "Findings and their cures",
    )
    if work.measurement is None and present:
        recall(len(measured.bands_hz))
    if work.measurement is not None:
        decays()


def table(measured: Any) -> Any:
    """Every band in words and numbers."""

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
        show.chart(charts.decay(decay_picture(band)), key="decay")
    st.markdown(show.plain(band.reason or "evaluated"))


if work.measured is not None:
    results()
