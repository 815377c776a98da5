"""The folder's public names: every one is there, and importing the folder loads nothing heavy."""

import subprocess
import sys

import planner.report


def test_every_public_name_exists_and_has_its_docstring():
    for name in planner.report.__all__:
        assert getattr(planner.report, name).__doc__


def test_public_names_are_these():
    assert planner.report.__all__ == [
        "Acceptance", "Alternative", "BuyingList", "Chart", "Document", "Measurement", "ModeList",
        "Panel", "ReportData", "Written", "acceptance_document", "buying_list", "judge",
        "list_document", "placed_panels", "report_document", "to_dxf", "to_html", "to_pdf",
        "write_document", "write_drawings", "write_list",
    ]  # fmt: skip


def test_nothing_heavy_is_loaded_until_it_is_needed():
    heavy = "pandas scipy altair typst vl_convert ezdxf shapely xlsxwriter streamlit"
    code = (
        "import sys, planner.report, planner.report.charts, planner.report.drawings, "
        "planner.report.printing\n"
        f"sys.exit(', '.join(m for m in '{heavy}'.split() if m in sys.modules))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.stderr.strip() == ""
