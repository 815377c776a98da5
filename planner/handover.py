"""What leaves a project on paper: the shopping list, the drawings, the report, the acceptance sheet."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from planner import __version__
from planner.absorption.library import bibliography
from planner.bands import OCTAVES
from planner.errors import OptionError
from planner.project import Project
from planner.report import joins
from planner.report.report_data import Alternative, ReportData

if TYPE_CHECKING:
    from planner.measure.measured import Measured
    from planner.report.acceptance import Acceptance
    from planner.report.buying import BuyingList
    from planner.report.document import Document
    from planner.report.drawings import Panel
    from planner.treat.option import Option
    from planner.treat.shopping import ShoppingList
    from planner.treat.suggestion import Suggestion

REPORTED_MODES_HZ = 200.0
"""Modes up to here are listed in a report. [Hz]"""


def shopping(project: Project, option: Option) -> ShoppingList:
    """Packs, pieces, weight and cost of an option."""
    from planner.treat.shopping import shopping_list

    return shopping_list(option, project.catalogue, currency=project.room.treatment.currency)


def placed(project: Project, option: Option) -> Option:
    """The option with a place for every panel that has none yet."""
    if all(item.placement for item in option.items):
        return option
    try:
        return project.place(option).in_option(option)
    except OptionError:
        return option  # the list can be bought all the same; the drawing shows what has a place


def panels(project: Project, option: Option) -> list[Panel]:
    """Every panel that has a place, numbered as on the list."""
    from planner.report.buying import placed_panels

    return placed_panels(placed(project, option), project.catalogue, project.room)


def buying(project: Project, option: Option) -> BuyingList:
    """The shopping list with raw goods, fixings and panel numbers."""
    from planner.report.buying import buying_list

    with_places = placed(project, option)
    return buying_list(
        shopping(project, with_places),
        with_places,
        project.catalogue,
        project.room,
        units=project.room.units,
    )


def alternative(
    project: Project, option: Option, measured: Measured | None = None, *, chosen: bool = False
) -> Alternative:
    """One row of a comparison of options."""
    return joins.alternative(
        option,
        project.predict(option, measured),
        shopping(project, option),
        project.catalogue,
        project.before(measured),
        project.after(option, measured),
        chosen=chosen,
    )


def acceptance(project: Project, after: Measured, confidence: float = 0.95) -> Acceptance:
    """The treated room's measurement judged by the target, band by band."""
    from planner.reconcile.octaves import octave_times
    from planner.report.acceptance import judge

    times = octave_times(after)
    target, none = project.target, np.full(len(OCTAVES), np.nan)
    return judge(
        times.t_s,
        times.u_s,
        none if target is None else target.low,
        none if target is None else target.high,
        confidence=confidence,
    )


def report_data(
    project: Project,
    *,
    option: Option | None = None,
    measured: Measured | None = None,
    after: Measured | None = None,
    others: Sequence[Option] = (),
    suggestion: Suggestion | None = None,
    files: Sequence[Path] = (),
    paper: str = "a4",
) -> ReportData:
    """Everything that is known of a project, as a report takes it.

    Parameters
    ----------
    project
        The room.
    option
        The chosen treatment.
    measured, after
        Measurements of the untreated and of the treated room.
    others
        Options to compare with the chosen one.
    suggestion
        The proof of the chosen option, where the optimiser made it.
    files
        What the report is made from: their digests are printed.
    paper
        ``a4``, ``a3`` or ``us-letter``.
    """
    calibration = None if measured is None else project.calibration(measured)
    chosen = None if option is None else placed(project, option)
    options = [alternative(project, other, measured) for other in others]
    if chosen is not None:
        options.insert(0, alternative(project, chosen, measured, chosen=True))
    proof = None
    if chosen is not None and measured is not None and after is not None:
        proof = project.prove(measured, after, chosen)
    return ReportData(
        room=project.room,
        surfaces=project.surfaces,
        materials=project.library,
        target=project.target,
        prediction=project.predict(),
        modes=joins.mode_list(project.modes(REPORTED_MODES_HZ)),
        measurement=None if measured is None else joins.measurement_of(measured),
        comparison=None if measured is None else project.compare(measured),
        calibrated=() if calibration is None else joins.calibrated_rows(calibration),
        calibration_words=() if calibration is None else calibration.words,
        options=tuple(options),
        suggestion=suggestion,
        after=None if chosen is None else project.predict(chosen, measured),
        treatment_name="" if chosen is None else chosen.name,
        buying=None if chosen is None else buying(project, chosen),
        panels=() if chosen is None else tuple(panels(project, chosen)),
        proof=proof,
        acceptance=None if after is None else acceptance(project, after),
        product_sources=() if chosen is None else joins.product_sources(chosen, project.catalogue),
        bibliography=_references(project),
        warnings=project.warnings,
        inputs=joins.input_files(files),
        version=__version__,
        date="" if measured is None else measured.date,
        timestamp=max((int(path.stat().st_mtime) for path in files), default=0),
        units=project.room.units,
        paper=paper,
    )


def acceptance_sheet(data: ReportData) -> Document:
    """One page to sign: the treated room's measurement judged by the target."""
    from planner.report.acceptance import acceptance_document

    assert data.acceptance is not None
    return acceptance_document(
        data.acceptance,
        data.target,
        room=data.room.name,
        facts=(("Treatment", data.treatment_name or "–"), ("State", data.room.described_state)),
        before=None if data.measurement is None else data.measurement.t_s,
        paper=data.paper,
        date=data.date,
        timestamp=data.timestamp,
    )


def _references(project: Project) -> tuple[str, ...]:
    """Sources of the materials in this room, in full."""
    known = bibliography()
    used: dict[str, None] = {}
    for name in (*project.surfaces.materials, *project.surfaces.items):
        material = project.library.get(name)
        if material is not None and material.source:
            used[known.get(material.source, material.source)] = None
    return tuple(used)
