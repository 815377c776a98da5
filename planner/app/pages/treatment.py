"""Treatment: limits and products, the proven suggestion, options side by side, edits by hand."""

from __future__ import annotations

from functools import partial
from typing import Any

import numpy as np
import pandas as pd
import streamlit as st

from planner.app import cached, show
from planner.app.main import current
from planner.bands import OCTAVES
from planner.errors import PlannerError
from planner.report import charts
from planner.report.drawings import on_screen
from planner.treat.option import Option, OptionItem

work = current()
room = work.room
st.title("Treatment")
st.caption(
    "For the room as its measurement corrects it."
    if work.use_measured
    else "For the room as described."
)


def limits() -> None:
    """Budget, formula, where panels may go."""
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
            "Pairs that get the same panels", list(pairs), default=now, key=f"pairs-{work.serial}"
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


def products() -> None:
    """The catalogue: the project's own, or the generic one, and a way to put one's own in."""
    own = work.folder / "catalogue.csv"
    catalogue = work.project.catalogue
    st.markdown(
        "The project's own **catalogue.csv**."
        if own.is_file()
        else "Generic products with **invented prices**."
    )
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
    upload = st.file_uploader(
        "Own catalogue (CSV)",
        type=["csv"],
        key=f"catalogue-{work.serial}-{st.session_state.get('catalogued', 0)}",
    )
    if upload is not None:
        from planner.treat.catalogue_file import products_from_bytes

        try:
            products_from_bytes(upload.getvalue(), file=upload.name)
            work.save("catalogue.csv", upload.getvalue().decode("utf-8", "replace"), force=True)
            st.session_state["catalogued"] = st.session_state.get("catalogued", 0) + 1
            st.rerun()
        except PlannerError as error:
            show.refusal(error)
    if own.is_file():
        edited = st.data_editor(
            pd.read_csv(own, comment="#", dtype=str, keep_default_na=False),
            num_rows="dynamic", width="stretch", key=f"catalogue-edit-{work.serial}-{own.stat().st_mtime_ns}",
        )  # fmt: skip
        if st.button("Save this catalogue", key="catalogue-save"):
            from planner.treat.catalogue_file import products_from_bytes

            text = edited.fillna("").to_csv(index=False)
            try:
                products_from_bytes(text.encode(), file="catalogue.csv")
                work.save("catalogue.csv", text, force=True)
                st.rerun()
            except PlannerError as error:
                show.refusal(error)


def suggest() -> None:
    """Ask for the cheapest list, and say what is proven."""
    left, right = st.columns(2)
    sure = left.select_slider(
        "Probability of meeting the target, the coefficients being uncertain",
        ["as the tables say", "60 %", "70 %", "80 %", "90 %"], value="as the tables say", key="confidence",
    )  # fmt: skip
    name = right.text_input(
        "Name of the option", value=free_name("Suggestion"), key=f"suggest-name-{len(work.options)}"
    )
    if st.button("Suggest the cheapest treatment", type="primary", key="suggest"):
        with st.spinner("Looking for the cheapest list …"):
            try:
                found, placement = work.project.suggest(
                    work.calibrating,
                    confidence=None if sure.startswith("as") else float(sure[:2]) / 100,
                    name=name.strip() or free_name("Suggestion"),
                )
                work.suggestion = found
                work.set_option(found.option)
                st.session_state["placement-notes"] = list(placement.warnings)
            except PlannerError as error:
                show.refusal(error)
                return
    answer = work.suggestion
    if answer is None:
        return
    unit = "m²" if answer.currency == "m2" else answer.currency
    if answer.status == "infeasible":
        st.error("The target cannot be met within these limits. This list comes closest:")
    elif answer.gap < 1e-6:
        st.success(f"{answer.cost:.2f} {unit}, proven: no list within these limits is cheaper.")
    else:
        st.success(
            f"{answer.cost:.2f} {unit}; no list can be cheaper by more than {answer.gap:.1%}."
        )
    st.markdown(
        f"Probability that every judged band lies inside the target: **{answer.probability:.0%}**"
    )
    for band in answer.short_bands:
        st.markdown(
            f"- {band.band_hz} Hz stays {band.side}: {band.missing_m2:.1f} m² of absorption are missing, "
            f"{band.largest_possible_m2:.1f} m² can be had."
        )
    for relaxation in answer.relaxations:
        st.markdown(f"- It could be met: {show.plain(relaxation.says)}")
    if answer.second_opinion is not None:
        st.markdown(show.plain(answer.second_opinion.says))
    show.notes([*answer.warnings, *st.session_state.get("placement-notes", [])])


def free_name(start: str) -> str:
    """A name that no option has."""
    number = 1
    while f"{start} {number}" in work.options:
        number += 1
    return f"{start} {number}"


def items_table(option: Option) -> list[dict[str, Any]]:
    """Rows of an option as they are edited."""
    catalogue = work.project.catalogue
    return [
        {
            "product": item.product,
            "what": catalogue[item.product].description if item.product in catalogue else "",
            "surface": item.surface,
            "pieces": item.count,
            "area (m²)": item.area,
        }
        for item in option.items
    ]


def edit(option: Option) -> None:
    """Counts by hand, with what they do."""
    st.subheader(f"Edit {show.plain(option.name)}")
    base = pd.DataFrame(
        items_table(option), columns=["product", "what", "surface", "pieces", "area (m²)"]
    )
    catalogue = work.project.catalogue
    edited = st.data_editor(
        base,
        num_rows="dynamic",
        width="stretch",
        hide_index=True,
        key=f"edit-{work.serial}-{option.name}-{st.session_state.get('edited', 0)}",
        column_config={
            "product": st.column_config.SelectboxColumn(options=list(catalogue), required=True),
            "what": st.column_config.TextColumn(disabled=True),
            "surface": st.column_config.SelectboxColumn(
                options=[*room.surface_names, "free"], required=True
            ),
            "pieces": st.column_config.NumberColumn(min_value=0, step=1),
            "area (m²)": st.column_config.NumberColumn(min_value=0.0, step=0.1),
        },
    )
    try:
        changed = option_of(edited, option)
        prediction = cached.prediction(work, changed)
    except PlannerError as error:
        show.refusal(error)
        return
    show.chart(
        charts.reverberation(
            [
                show.prediction_series(cached.prediction(work), "Untreated", "untreated"),
                show.prediction_series(prediction, changed.name, "option-a"),
            ],
            prediction.target,
            title=f"With {option.name}",
        ),
        key="edited",
        table=False,
    )
    for line in prediction.verdicts:
        st.markdown(show.plain(line))
    if changed != option and st.button("Keep these counts", type="primary", key="keep-counts"):
        work.set_option(changed)
        st.session_state["edited"] = st.session_state.get("edited", 0) + 1
        st.rerun()
    views(changed)


def option_of(edited: pd.DataFrame, option: Option) -> Option:
    """The option that an edited table says; places of unchanged items are kept."""
    before = {(item.product, item.surface): item for item in option.items}
    items = []
    for row in edited.to_dict("records"):
        if not isinstance(row["product"], str) or not isinstance(row["surface"], str):
            continue
        count = 0 if pd.isna(row["pieces"]) else int(row["pieces"])
        area = 0.0 if pd.isna(row["area (m²)"]) else float(row["area (m²)"])
        if not count and not area:
            continue
        known = before.get((row["product"], row["surface"]))
        same = known is not None and known.count == (count or None) and known.area == (area or None)
        items.append(
            known if known is not None and same
            else OptionItem(product=row["product"], surface=row["surface"], count=count or None, area=None if count else area)
        )  # fmt: skip
    return option.model_copy(update={"items": tuple(items)})


def views(option: Option) -> None:
    """Where the panels go."""
    from planner.handover import panels

    found = show.guarded(lambda: panels(work.project, option))
    if not found:
        return
    used = list(dict.fromkeys(panel.surface for panel in found))
    which = (
        st.segmented_control("Panels on", used, default=used[0], key=f"panels-{option.name}")
        or used[0]
    )
    show.drawing(
        on_screen(
            room,
            which,
            [p for p in found if p.surface == which],
            units=room.units,
            theme=show.theme(),
        ),
        f"Panels on {which}, to scale",
    )


def manage() -> None:
    """Copy, rename, delete."""
    names = list(work.options)
    at = names.index(work.chosen) if work.chosen in names else 0
    work.chosen = st.selectbox(
        "Option", names, index=at, key=f"chosen-{work.serial}-{'|'.join(names)}"
    )
    option = work.option
    assert option is not None
    one, two, three, four = st.columns([2, 1, 1, 1], vertical_alignment="bottom")
    name = one.text_input("New name", value=option.name, key=f"rename-{option.name}")
    if two.button(
        "Rename",
        key="rename",
        disabled=name.strip() in ("", option.name) or name.strip() in work.options,
    ):
        work.set_option(option.model_copy(update={"name": name.strip()}), replacing=option.name)
        st.rerun()
    if three.button("Copy", key="copy"):
        made = show.guarded(
            lambda: work.set_option(option.model_copy(update={"name": free_name(option.name)}))
        )
        if made is None and work.chosen != option.name:
            st.rerun()
    if four.button("Delete", key="delete"):
        work.remove_option(option.name)
        st.rerun()


def compare() -> None:
    """Options side by side."""
    names = list(work.options)
    chosen = st.multiselect(
        "Side by side (up to six)",
        names,
        default=names[:4],
        max_selections=6,
        key=f"beside-{work.serial}-{'|'.join(names)}",
    )
    rows = []
    for name in chosen:
        row = show.guarded(partial(cached.alternative, work, work.options[name]))
        if row is not None:
            rows.append(row)
    if not rows:
        return
    st.dataframe(
        pd.DataFrame(
            [
                {
                    "option": row.name,
                    **{
                        f"{hz} Hz (s)": round(float(t), 2)
                        for hz, t in zip(OCTAVES, row.predicted, strict=True)
                    },
                    "outside at (Hz)": ", ".join(map(str, row.outside_hz)) or "none",
                    "inside with": "–" if row.probability is None else f"{row.probability:.0%}",
                    f"cost ({room.treatment.currency})": row.cost,
                    "deepest (mm)": row.depth_mm,
                    "covers (m²)": None if row.area_m2 is None else round(row.area_m2, 1),
                    "cost per m² at 125 Hz": None
                    if row.cost_per_m2_125 is None
                    else round(row.cost_per_m2_125),
                    "cost per m² at 1 kHz": None
                    if row.cost_per_m2_1000 is None
                    else round(row.cost_per_m2_1000),
                }
                for row in rows
            ]
        ),
        hide_index=True,
        width="stretch",
    )
    before = cached.prediction(work)
    after = {row.name: cached.prediction(work, work.options[row.name]) for row in rows}
    # Lines alone, on one common axis: intervals stand above, with each option.
    highest = max(float(np.nanmax(one.time)) for one in (before, *after.values()))
    columns = st.columns(2)
    for number, (name, prediction) in enumerate(after.items()):
        with columns[number % 2]:
            show.chart(
                charts.reverberation(
                    [
                        charts.Series("Untreated", before.time, assumed_hz=before.assumed_hz),
                        charts.Series(
                            name, prediction.time, "option-a", assumed_hz=prediction.assumed_hz
                        ),
                    ],
                    work.project.target,
                    title=name,
                    highest=float(np.ceil(5 * highest) / 5),
                    notes=False,
                ),
                key=f"beside-{number}",
                table=False,
            )


with st.expander("Limits"):
    limits()
with st.expander("Products"):
    products()
if work.project.target is None:
    st.info("Choose a target on the page Room first.")
    st.stop()
st.header("Suggestion")
suggest()
if not work.options:
    st.stop()
st.header("Options")
manage()
if work.option is not None:
    edit(work.option)
st.header("Side by side")
compare()
