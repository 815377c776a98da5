"""Slow steps, kept by the content they depend on: never by arrays, never without a bound."""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import TYPE_CHECKING

import streamlit as st

from planner.app.work import Work
from planner.measure.measured import measured_from_bytes, measured_to_csv
from planner.project import Project
from planner.room.files import parse_room, room_to_toml
from planner.treat.option import option_from, option_to_toml

if TYPE_CHECKING:
    from planner.measure.measured import Measured
    from planner.predict.mode_shapes import PlanPressure
    from planner.predict.prediction import Prediction
    from planner.predict.room_modes import RoomModes
    from planner.predict.seat import Seat
    from planner.reconcile.compare import Comparison
    from planner.report.report_data import Alternative
    from planner.treat.option import Option


def prediction(
    work: Work, option: Option | None = None, *, calibrated: bool | None = None
) -> Prediction:
    """Prediction of the room, treated or not; calibrated as the project says where not given."""
    measured = work.measured if (work.use_measured if calibrated is None else calibrated) else None
    return _prediction(*_content(work, option, measured))


def alternative(work: Work, option: Option) -> Alternative:
    """An option's row of the comparison."""
    return _alternative(*_content(work, option, work.calibrating))


def modes(work: Work, highest_hz: float) -> RoomModes:
    """Modes of the room."""
    return _modes(room_to_toml(work.room), highest_hz)


def mode_plan(work: Work, highest_hz: float, number: int) -> PlanPressure:
    """Pressure of one mode over the plan."""
    return _mode_plan(room_to_toml(work.room), highest_hz, number)


def seat(work: Work) -> Seat:
    """Bass and first reflections at the seat."""
    return _seat(room_to_toml(work.room))


def comparison(work: Work) -> Comparison:
    """Predicted against measured."""
    assert work.measured is not None
    return _comparison(room_to_toml(work.room), measured_to_csv(work.measured))


def _content(
    work: Work, option: Option | None, measured: Measured | None
) -> tuple[str, str, str, str, str]:
    catalogue = work.folder / "catalogue.csv"
    digest = hashlib.sha256(catalogue.read_bytes()).hexdigest() if catalogue.is_file() else ""
    return (
        room_to_toml(work.room),
        "" if option is None else option_to_toml(option),
        "" if measured is None else measured_to_csv(measured),
        str(work.folder),
        digest,
    )


def _inputs(
    room: str, option: str, measured: str, folder: str
) -> tuple[Project, Option | None, Measured | None]:
    import tomllib

    return (
        Project(parse_room(room), Path(folder)),
        option_from(tomllib.loads(option)) if option else None,
        measured_from_bytes(measured.encode(), "measured.csv") if measured else None,
    )


@st.cache_data(max_entries=64, show_spinner=False)
def _prediction(room: str, option: str, measured: str, folder: str, digest: str) -> Prediction:
    project, treatment, table = _inputs(room, option, measured, folder)
    return project.predict(treatment, table)


@st.cache_data(max_entries=64, show_spinner=False)
def _alternative(room: str, option: str, measured: str, folder: str, digest: str) -> Alternative:
    from planner.handover import alternative as row

    project, treatment, table = _inputs(room, option, measured, folder)
    assert treatment is not None
    return row(project, treatment, table)


@st.cache_data(max_entries=16, show_spinner="Finding the modes …")
def _modes(room: str, highest_hz: float) -> RoomModes:
    return Project(parse_room(room), Path()).modes(highest_hz)


@st.cache_data(max_entries=8, show_spinner="Adding up the bass at the seat …")
def _seat(room: str) -> Seat:
    return Project(parse_room(room), Path()).seat()


@st.cache_data(max_entries=32, show_spinner=False)
def _mode_plan(room: str, highest_hz: float, number: int) -> PlanPressure:
    from planner.air import speed_of_sound
    from planner.predict.mode_shapes import plan_pressure

    described = parse_room(room)
    return plan_pressure(
        described.footprint,
        _modes(room, highest_hz).modes.orders[number],
        rectangle=described.is_rectangle,
        highest_hz=highest_hz,
        speed_of_sound=float(speed_of_sound(described.air_state().temperature_c)),
    )


@st.cache_data(max_entries=16, show_spinner="Comparing …")
def _comparison(room: str, measured: str) -> Comparison:
    return Project(parse_room(room), Path()).compare(
        measured_from_bytes(measured.encode(), "measured.csv")
    )
