"""On screen and on paper: numbers, rooms, placed panels and lists enter; pictures and files leave.

Charts are Vega-Lite dictionaries shared by the browser app and the paper, drawings are SVG or DXF,
lists and reports are PDF, HTML, spreadsheets or plain text.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_PLACE = {
    "Acceptance": "acceptance",
    "Alternative": "report_data",
    "BuyingList": "buying",
    "Chart": "chart",
    "Document": "document",
    "Measurement": "report_data",
    "ModeList": "report_data",
    "Panel": "drawings",
    "ReportData": "report_data",
    "Written": "printing",
    "acceptance_document": "acceptance",
    "buying_list": "buying",
    "judge": "acceptance",
    "list_document": "list_formats",
    "placed_panels": "buying",
    "report_document": "report",
    "to_dxf": "dxf",
    "to_html": "html",
    "to_pdf": "typeset",
    "write_document": "printing",
    "write_drawings": "printing",
    "write_list": "printing",
}

__all__ = sorted(_PLACE)


def __getattr__(name: str) -> Any:
    """Public things, loaded when they are first asked for."""
    if name not in _PLACE:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f"{__name__}.{_PLACE[name]}"), name)
