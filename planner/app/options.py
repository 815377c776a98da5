"""The options of a project: suggested, edited by hand, set side by side."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np
import pandas as pd
import streamlit as st

from planner.app import cached, show
from planner.app.tables import edited, option_of, option_rows
from planner.app.work import Work
from planner.bands import OCTAVES
from planner.errors import OptionError, PlannerError
from planner.report import charts
from planner.report.drawings import on_screen
from planner.report.quantities import Quantities
from planner.treat.option import Option

if TYPE_CHECKING:
    from planner.report.report_data import Alternative
    from planner.treat.suggestion import Suggestion

SUGGESTED = "Suggested: "
"""How the note of an option begins that nobody has edited yet."""


def free_name(work: Work, start: str) -> str:
    """A name that no option has."""
    number = 1
    while f"{start} {number}" in work.options:
        number += 1
    return f"{start} {number}"


def suggest(work: Work) -> None:
    """Ask for the cheapest list, and say what is proven."""
    left, right = st.columns(2)
    sure = left.select_slider(
        "Probability of meeting the target, the coefficients being uncertain",
        ["as the tables say", "60 %", "70 %", "80 %", "90 %"], value="as the tables say", key="confidence",
    )  # fmt: skip
    name = right.text_input(
        "Name of the option",
        value=free_name(work, "Suggestion"),
        max_chars=80,
        key=f"suggest-name-{work.serial}-{len(work.options)}",
    )
    if st.button("Suggest the cheapest treatment", type="primary", key="suggest"):
        with st.spinner("Looking for the cheapest list …"):
            try:
                if name.strip() in work.options:
                    raise OptionError(
                        f"there is an option {name.strip()!r} already", cure="Choose another name."
                    )
                found, placement = work.project.suggest(
                    work.calibrating,
                    confidence=None if sure.startswith("as") else float(sure[:2]) / 100,
                    name=name.strip() or free_name(work, "Suggestion"),
                )
                work.suggestion = found
                note = f"{SUGGESTED}{proof(found)}"[:2000]
                work.set_option(found.option.model_copy(update={"note": note}))
                words = _in_words(found, placement.warnings, Quantities(work.room.units))
                work.answer = {"option": found.option.name, "of": work.basis, **words}
                st.session_state["edited"] = st.session_state.get("edited", 0) + 1
            except PlannerError as error:
                show.refusal(error)
                return
    about = work.options.get(work.answer.get("option", ""))
    untouched = about is not None and about.note.startswith(SUGGESTED)
    if untouched and work.answer["of"] == work.basis:
        _answer(work.answer)


def proof(answer: Suggestion) -> str:
    """What is proven about a suggestion, in one sentence."""
    unit = "m² bought" if answer.currency == "m2" else answer.currency
    if answer.status == "infeasible":
        return "the target cannot be met within these limits; this list comes closest."
    if answer.gap < 1e-6:
        return f"{answer.cost:.2f} {unit}, proven: no list within these limits is cheaper."
    return f"{answer.cost:.2f} {unit}; no list can be cheaper by more than {answer.gap:.1%}."


def _in_words(answer: Suggestion, placing: Sequence[str], units: Quantities) -> dict[str, Any]:
    """The proof, and what would help where the target cannot be met; as a reload is to find it."""
    says = show.plain(proof(answer))
    lines = [
        f"- {band.band_hz} Hz stays {band.side}: {band.reached_s:.2f} s, limit "
        f"{band.limit_s:.2f} s; {units.area(band.missing_m2)} of absorption are missing, "
        f"{units.area(band.largest_possible_m2)} can be had within the limits."
        for band in answer.short_bands
    ]
    if answer.status == "infeasible":
        lines += [f"- Used up: {show.plain(units.sentence(limit))}." for limit in answer.binding]
    lines += [
        f"- It could be met: {show.plain(units.sentence(relaxation.says))}"
        for relaxation in answer.relaxations
    ]
    if answer.second_opinion is not None:
        lines += ["", show.plain(answer.second_opinion.says)]
    sure = f"{answer.probability:.0%}"
    return {
        "met": answer.status != "infeasible",
        "proof": says[0].upper() + says[1:],
        "sure": f"Probability that every judged band lies inside the target: **{sure}**",
        "lines": "\n".join(lines),
        "doubts": [*answer.warnings, *placing],
    }


def _answer(words: Mapping[str, Any]) -> None:
    """Show what was answered last."""
    name = show.plain(words["option"])
    (st.success if words["met"] else st.error)(f"{name}: {words['proof']}")
    st.markdown(words["sure"])
    if words["lines"]:
        st.markdown(words["lines"])
    show.notes(words["doubts"])


def manage(work: Work) -> None:
    """Choose, copy, rename, delete."""
    names = list(work.options)
    at = names.index(work.chosen) if work.chosen in names else 0
    work.chosen = st.selectbox(
        "Option", names, index=at, key=f"chosen-{work.serial}-{'|'.join(names)}"
    )
    option = work.options[work.chosen]
    name = st.text_input(
        "New name", value=option.name, max_chars=80, key=f"rename-{work.serial}-{option.name}"
    ).strip()
    with st.container(horizontal=True):
        taken = name in ("", option.name) or name in work.options
        rename = st.button("Rename", key="rename", disabled=taken)
        copy = st.button("Copy", key="copy")
        delete = st.button("Delete", key="delete")
    try:
        if rename:
            work.set_option(option.model_copy(update={"name": name}), replacing=option.name)
            st.rerun()
        if copy:
            made = option.model_copy(update={"name": free_name(work, option.name)})
            work.set_option(made)
            st.rerun()
        if delete:
            work.remove_option(option.name)
            st.rerun()
    except PlannerError as error:
        show.refusal(error)


def edit(work: Work, option: Option) -> None:
    """Counts by hand, kept at once, with what they do."""
    st.subheader(f"Edit {show.plain(option.name)}")
    if option.note:
        st.caption(show.plain(option.note))
    left, right = st.columns([1, 1], gap="large")
    with left:
        changed = _table(work, option)
    if changed is None:
        return
    with right:
        prediction = cached.prediction(work, changed)
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
        )
        for line in prediction.verdicts:
            st.markdown(show.plain(line))
    with left:
        views(work, changed)


def _table(work: Work, option: Option) -> Option | None:
    """The option as it is edited, or None where that cannot be."""
    catalogue = show.guarded(lambda: work.project.catalogue)
    if catalogue is None:
        return None
    key = f"edit-{work.serial}-{option.name}-{st.session_state.get('edited', 0)}"
    table = edited(
        option_rows(option, catalogue),
        key=key,
        column_order=["product", "surface", "pieces", "area", "what"],
        column_config={
            "product": st.column_config.SelectboxColumn(
                "Product", options=list(catalogue), required=True
            ),
            "what": st.column_config.TextColumn("What it is", disabled=True),
            "surface": st.column_config.SelectboxColumn(
                "Surface", options=[*work.room.surface_names, "free"], required=True
            ),
            "pieces": st.column_config.NumberColumn("Pieces", min_value=0, step=1),
            "area": st.column_config.NumberColumn("Area (m²)", min_value=0.0, step=0.1),
        },
    )
    st.caption("Every change is kept at once; copy the option first to keep it as it was.")
    try:
        changed = option_of(table.to_dict("records"), option)
        if changed.items != option.items:
            if changed.note.startswith(SUGGESTED):
                changed = changed.model_copy(update={"note": ""})
            cached.prediction(work, changed)  # refuses what does not fit, before it is kept
            work.set_option(changed, replacing=option.name)
    except PlannerError as error:
        show.refusal(error)
        st.caption("Not kept: the option stays as it was until this is put right.")
        return option
    return changed


def views(work: Work, option: Option) -> None:
    """Where the panels go."""
    from planner.handover import panels

    found = show.guarded(lambda: panels(work.project, option))
    if not found:
        return
    used = list(dict.fromkeys(panel.surface for panel in found))
    chosen = st.segmented_control(
        "Panels on", used, default=used[0], key=f"panels-{work.serial}-{option.name}"
    )
    which = chosen or used[0]
    here = [panel for panel in found if panel.surface == which]
    show.drawing(
        on_screen(work.room, which, here, units=work.room.units, theme=show.theme()),
        f"Panels on {which}, to scale",
    )


def compare(work: Work) -> None:
    """Options side by side: one column each, one row for each thing that tells them apart."""
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
    table = pd.DataFrame({row.name: _column(row, work) for row in rows})
    table.index.name = "compared"
    st.dataframe(table, width="stretch", height="content")
    _charts(work, rows)


def _column(row: Alternative, work: Work) -> dict[str, str]:
    """One option in numbers with units."""

    def shown(value: float | None, digits: int = 0, unit: str = "") -> str:
        return "–" if value is None or not np.isfinite(value) else f"{value:,.{digits}f}{unit}"

    currency, units = work.room.treatment.currency, Quantities(work.room.units)
    return {
        "cost": shown(row.cost, 2, f" {currency}"),
        "outside the target at": ", ".join(f"{hz} Hz" for hz in row.outside_hz) or "no judged band",
        "inside with a probability of": shown(
            None if row.probability is None else 100 * row.probability, 0, " %"
        ),
        "deepest": shown(row.depth_mm, 0, " mm"),
        "covers": units.area(row.area_m2),
        "cost per m² of absorption at 125 Hz": shown(row.cost_per_m2_125, 0, f" {currency}"),
        "cost per m² of absorption at 1 kHz": shown(row.cost_per_m2_1000, 0, f" {currency}"),
        **{
            f"T at {hz} Hz": shown(float(time), 2, " s")
            for hz, time in zip(OCTAVES, row.predicted, strict=True)
        },
    }


def _charts(work: Work, rows: list[Alternative]) -> None:
    """Small charts on one common axis; intervals stand above, with each option."""
    before = cached.prediction(work)
    after = {row.name: cached.prediction(work, work.options[row.name]) for row in rows}
    highest = max(float(np.nanmax(one.time)) for one in (before, *after.values()))
    columns = st.columns(2)
    for number, (name, prediction) in enumerate(after.items()):
        lines = [
            charts.Series("Untreated", before.time, assumed_hz=before.assumed_hz),
            charts.Series(name, prediction.time, "option-a", assumed_hz=prediction.assumed_hz),
        ]
        with columns[number % 2]:
            show.chart(
                charts.reverberation(
                    lines,
                    work.project.target,
                    title=name,
                    highest=float(np.ceil(5 * highest) / 5),
                    notes=False,
                ),
                key=f"beside-{number}",
                table=False,  # the table above holds these numbers
            )
