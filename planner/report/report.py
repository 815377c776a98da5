"""The whole report from a `ReportData`: one page for the client, then everything with its source."""

from __future__ import annotations

from planner.report.document import Document
from planner.report.report_choice import (
    buying_sections,
    drawing_sections,
    option_sections,
    proof_sections,
    treatment_sections,
)
from planner.report.report_client import client_page
from planner.report.report_data import ReportData
from planner.report.report_room import (
    assumption_sections,
    reproduction_sections,
    room_sections,
    source_sections,
    word_sections,
)
from planner.report.report_sound import (
    calibration_sections,
    measurement_sections,
    mode_sections,
    prediction_sections,
)


def report_document(data: ReportData) -> Document:
    """The report as a document for PDF or HTML; sections without data are left out."""
    sections = (
        *client_page(data),
        *room_sections(data),
        *assumption_sections(data),
        *prediction_sections(data),
        *mode_sections(data),
        *measurement_sections(data),
        *calibration_sections(data),
        *option_sections(data),
        *treatment_sections(data),
        *drawing_sections(data),
        *buying_sections(data),
        *proof_sections(data),
        *source_sections(data),
        *word_sections(),
        *reproduction_sections(data),
    )
    return Document(
        title=data.room.name,
        subtitle=" – ".join(part for part in ("Room treatment report", data.date) if part),
        sections=sections,
        paper=data.paper,
        date=data.date,
        timestamp=data.timestamp,
        footer=f"Room treatment report, {data.room.name}",
        contents=False,
    )
