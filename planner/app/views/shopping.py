"""Shopping list: what to buy for an option, what it costs, and what to mind."""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from pathlib import Path

import pandas as pd
import streamlit as st

from planner.app import show
from planner.app.main import current
from planner.app.work import file_name
from planner.handover import buying, report_data, shopping
from planner.report.quantities import Quantities
from planner.treat.option import option_to_toml

work = current()
st.title("Shopping list")
if not work.options:
    st.info("There is no option yet: make one on the page Treatment.")
    st.stop()
names = list(work.options)
at = names.index(work.chosen) if work.chosen in names else 0
work.chosen = st.selectbox(
    "Option", names, index=at, key=f"shopping-{work.serial}-{'|'.join(names)}"
)
option = work.options[work.chosen]
project = work.project
bought = show.guarded(lambda: shopping(project, option))
if bought is None:
    st.stop()
listed = show.guarded(lambda: buying(project, option))
if listed is None:
    st.stop()

currency = bought.currency
st.dataframe(
    pd.DataFrame(
        [
            {
                "item": line.item,
                "where": line.where,
                "pieces": "–" if line.pieces is None else f"{line.pieces}",
                "packs": f"{line.packs} × {line.pack:g}" + (" m²" if line.unit == "m2" else ""),
                "area (m²)": round(line.area_m2, 2),
                "weight (kg)": "–" if line.weight_kg is None else f"{line.weight_kg:.1f}",
                f"cost ({currency})": "–" if line.cost is None else f"{line.cost:,.2f}",
                "spare (%)": round(line.spare_percent),
                "panels": line.panels,
                "price": line.price_basis,
            }
            for line in listed.lines
        ]
    ),
    hide_index=True,
    width="stretch",
)
left, middle, right = st.columns(3)
left.metric("Total", "–" if bought.total is None else f"{bought.total:,.2f} {currency}")
shown = Quantities(work.room.units)
middle.metric("Covered", shown.area(bought.area_m2))
right.metric("Weight", shown.weight(bought.weight_kg))
for text in bought.warnings:
    st.warning(show.plain(text[0].upper() + text[1:]))
if listed.raw:
    st.header("Raw goods for what is built by hand")
    st.dataframe(
        pd.DataFrame(
            [
                {
                    "goods": one.goods,
                    "needed": one.need,
                    "buy": one.buy,
                    "left over (%)": round(100 * one.waste),
                }
                for one in listed.raw
            ]
        ),
        hide_index=True,
        width="stretch",
    )
if listed.fixings:
    st.header("Fixings")
    st.dataframe(
        pd.DataFrame(
            [
                {
                    "for": one.product,
                    "goes": one.where,
                    "panels": one.panels,
                    "each": one.each,
                    "second retentions": one.retention,
                    "in all": one.total,
                    "kind": one.kind,
                    "note": one.note,
                }
                for one in listed.fixings
            ]
        ),
        hide_index=True,
        width="stretch",
    )
show.notes(listed.assumptions, "What raw goods and fixings rest on")


def written(ending: str) -> Callable[[], bytes]:
    """The list as a file, made when it is asked for."""

    def make() -> bytes:
        from planner.report.printing import write_list

        with tempfile.TemporaryDirectory() as folder:
            return write_list(Path(folder) / f"list{ending}", listed).path.read_bytes()

    return make


def report() -> bytes:
    """Everything on paper."""
    from planner.report.printing import write_document
    from planner.report.report import report_document

    others = [other for name, other in work.options.items() if name != option.name][:3]
    data = report_data(
        project, option=option, measured=work.measured if work.use_measured else None,
        others=others, suggestion=work.suggestion if work.suggestion and work.suggestion.option.name == option.name else None,
        files=[path for path in (work.folder / "room.toml", work.folder / "catalogue.csv", work.folder / "measured.csv") if path.is_file()],
    )  # fmt: skip
    with tempfile.TemporaryDirectory() as folder:
        return write_document(Path(folder) / "report.pdf", report_document(data)).path.read_bytes()


def drawings() -> bytes:
    """Plan and elevations for the fitter."""
    from planner.handover import panels
    from planner.report.printing import write_drawings

    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "drawings.pdf"
        return write_drawings(
            path, work.room, panels(project, option), units=work.room.units
        ).path.read_bytes()


st.header("Take with you")
stem = file_name(option.name)
columns = st.columns(4)
downloads: tuple[tuple[str, Callable[[], bytes], str, str], ...] = (
    ("List (PDF)", written(".pdf"), f"{stem}.pdf", "application/pdf"),
    ("List (CSV)", written(".csv"), f"{stem}.csv", "text/csv"),
    ("List (spreadsheet)", written(".xlsx"), f"{stem}.xlsx", "application/octet-stream"),
    ("List (web page)", written(".html"), f"{stem}.html", "text/html"),
    ("Drawings (PDF)", drawings, f"{stem}-drawings.pdf", "application/pdf"),
    ("Whole report (PDF)", report, f"{stem}-report.pdf", "application/pdf"),
    ("Option file", lambda: option_to_toml(option).encode(), f"{stem}.toml", "text/plain"),
)
for number, (label, make, name, kind) in enumerate(downloads):
    columns[number % 4].download_button(
        label, make, name, kind, on_click="ignore", key=f"take-{number}", width="stretch"
    )

st.header("Take care")
for text in bought.cautions:
    st.markdown(f"- {show.plain(text)}")
