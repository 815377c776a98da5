"""On screen and on paper: numbers, rooms, placed panels and lists enter; pictures and files leave.

Charts are Vega-Lite dictionaries shared by the browser app and the paper, drawings are SVG or DXF,
lists and reports are PDF, HTML, spreadsheets or plain text.
"""

__all__ = ["charts", "drawings", "dxf"]
