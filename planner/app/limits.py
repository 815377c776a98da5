"""What a treatment may cost and where it may go, and the products it is made of."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import streamlit as st

from planner.app import show
from planner.app.tables import HELD, catalogue_rows, catalogue_text, cells, edited, separator
from planner.app.work import Work
from planner.errors import PlannerError
from planner.treat.catalogue import Catalogue
from planner.treat.catalogue_file import products_from_bytes
from planner.treat.cells import decoded


def limits(work: Work) -> None:
    """Budget, formula, where panels may go."""
    room = work.room
    data = room.model_dump(by_alias=True)
    wanted = dict(data["treatment"])
    one, two, three = st.columns(3)
    budget = one.number_input(
        f"Budget ({room.treatment.currency}); 0 for none", 0.0, 1e6, float(room.treatment.budget or 0.0), 50.0,
        key=f"budget-{work.serial}",
    )  # fmt: skip
    wanted["budget"] = budget or None
    formulas = ["eyring", "sabine", "both"]
    wanted["formula"] = two.selectbox(
        "Formula that must meet the target", formulas, index=formulas.index(room.treatment.formula),
        key=f"formula-{work.serial}",
    )  # fmt: skip
    products = three.number_input(
        "Different products at most; 0 for any",
        0,
        20,
        room.treatment.max_products or 0,
        key=f"products-{work.serial}",
    )
    wanted["max_products"] = int(products) or None
    wanted["keep_clear"] = st.multiselect(
        "Surfaces that stay as they are", room.surface_names, default=list(room.treatment.keep_clear),
        key=f"clear-{work.serial}",
    )  # fmt: skip
    walls = room.wall_names
    if room.is_rectangle:
        pairs = {"left and right": ("left", "right"), "front and back": ("front", "back")}
        now = [
            name
            for name, pair in pairs.items()
            if tuple(sorted(pair)) in {tuple(sorted(p)) for p in room.treatment.symmetric}
        ]
        chosen = st.multiselect(
            "Pairs of walls that get the same panels",
            list(pairs),
            default=now,
            key=f"pairs-{work.serial}",
        )
        wanted["symmetric"] = [pairs[name] for name in chosen]
    st.caption("Largest share of each surface that panels may cover (%)")
    columns = st.columns(min(len(walls) + 1, 6))
    cover = dict(room.treatment.max_cover)
    for number, name in enumerate(("ceiling", *walls)):
        share = columns[number % len(columns)].number_input(
            name, 0, 100, round(100 * cover.get(name, 1.0)), 5, key=f"cover-{work.serial}-{name}"
        )
        cover[name] = share / 100
    wanted["max_cover"] = {name: value for name, value in cover.items() if value < 1.0}
    wanted["rented"] = st.checkbox(
        "Rented: nothing may be screwed on", room.treatment.rented, key=f"rented-{work.serial}"
    )
    data["treatment"] = wanted
    work.change_room(data)
    if work.problem is not None:
        show.refusal(work.problem)


def products(work: Work) -> None:
    """The catalogue: the project's own, or the generic one, and ways to make it one's own."""
    own = work.folder / "catalogue.csv"
    if own.is_file():
        st.markdown("The project's own **catalogue.csv**.")
        _edit(work, own)
    else:
        st.markdown("Generic products with **invented prices**.")
    catalogue = show.guarded(lambda: work.project.catalogue)
    if catalogue is not None:
        _list(catalogue)
    with st.container(horizontal=True):
        if not own.is_file() and st.button("Edit these as the project's own", key="catalogue-own"):
            _keep(work, _generic().decode("utf-8"))
    _upload(work)


def _generic() -> bytes:
    """The generic products as a file, for a start."""
    import planner

    here = Path(planner.__file__).parent
    folders = (here.parent / "materials", here / "_materials")
    return next(
        f / "catalogue.csv" for f in folders if (f / "catalogue.csv").is_file()
    ).read_bytes()


def _keep(work: Work, text: str) -> None:
    """Keep a catalogue that has been looked at, and show it from its beginning."""
    work.save("catalogue.csv", text)
    st.session_state["catalogued"] = st.session_state.get("catalogued", 0) + 1
    st.rerun()


def _edit(work: Work, own: Path) -> None:
    """Every cell of the project's catalogue; what holds is kept at once."""
    st.caption("Every change is kept as soon as the whole table holds.")
    key = f"catalogue-edit-{work.serial}-{st.session_state.get('catalogued', 0)}"
    try:
        raw = own.read_bytes()
        base = catalogue_rows(raw)
        table = edited(base, key=key)
        typed = cells(table) != cells(st.session_state[HELD][key])
        if cells(table) != cells(base) and (typed or work.is_mine("catalogue.csv")):
            work.save("catalogue.csv", catalogue_text(table, separator(raw)))
    except PlannerError as error:
        show.refusal(error)
        st.caption("Not kept yet: put this right first.")


def _upload(work: Work) -> None:
    """A catalogue from elsewhere in place of what there is."""
    upload = st.file_uploader(
        "Own catalogue (CSV)",
        type=["csv"],
        key=f"catalogue-{work.serial}-{st.session_state.get('catalogued', 0)}",
    )
    if upload is None:
        return
    try:
        products_from_bytes(upload.getvalue(), file=upload.name)
        text = decoded(upload.getvalue(), upload.name)
    except PlannerError as error:
        show.refusal(error)
        return
    _keep(work, text)


def _list(catalogue: Catalogue) -> None:
    """Products in words."""
    st.dataframe(
        pd.DataFrame(
            [
                {
                    "product": product.description or name,
                    "goes on": ", ".join(product.surfaces),
                    "pack": f"{product.pack:g}" + (" m²" if product.unit == "m2" else ""),
                    "price per pack": product.price_per_pack,
                    "deep (mm)": product.depth_mm,
                    "α 125 Hz": round(float(product.coefficients.alpha[1]), 2),
                    "α 1 kHz": round(float(product.coefficients.alpha[4]), 2),
                    "declared fire class": product.fire_class_declared or "none",
                }
                for name, product in catalogue.items()
            ]
        ),
        hide_index=True,
        width="stretch",
    )
