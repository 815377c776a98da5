"""What leaves a project on paper: the shopping list, the report, the acceptance sheet."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from planner import __version__
from planner.absorption.library import Material, bibliography
from planner.bands import OCTAVES
from planner.errors import OptionError
from planner.project import Project
from planner.report.report_data import (
    Alternative,
    InputFile,
    Measurement,
    ModeList,
    ReportData,
)

if TYPE_CHECKING:
    from planner.measure.measured import Measured
    from planner.predict.room_modes import RoomModes
    from planner.reconcile.calibration import Calibration
    from planner.report.acceptance import Acceptance
    from planner.report.buying import BuyingList
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
    if all(item.placement or item.count is None for item in option.items):
        return option
    try:
        return project.place(option).in_option(option)
    except OptionError:
        return option  # the list can be bought all the same; the drawing would say why it fails


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
    prediction = project.predict(option, measured)
    untreated, treated = project.before(measured), project.after(option, measured)
    cost = shopping(project, option).total
    added = treated.absorption_area - untreated.absorption_area
    depths = [project.catalogue[item.product].depth_mm or 0.0 for item in option.items]
    outside = prediction.outside & prediction.judged

    def per_area(hz: int) -> float | None:
        gain = float(added[OCTAVES.index(hz)])
        return cost / gain if cost is not None and gain > 0.05 else None

    from planner.treat.option import item_area

    return Alternative(
        name=option.name,
        predicted=prediction.time,
        cost=cost,
        probability=prediction.probability,
        outside_hz=tuple(hz for hz, out in zip(OCTAVES, outside, strict=True) if out),
        depth_mm=max(depths, default=0.0),
        area_m2=sum(item_area(item, project.catalogue[item.product]) for item in option.items),
        cost_per_m2_125=per_area(125),
        cost_per_m2_1000=per_area(1000),
        chosen=chosen,
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
    comparison = None if measured is None else project.compare(measured)
    chosen = None if option is None else placed(project, option)
    newest = max((int(path.stat().st_mtime) for path in files), default=0)
    options = [alternative(project, other, measured) for other in others]
    if chosen is not None:
        options.insert(0, alternative(project, chosen, measured, chosen=True))
    proof = None
    if chosen is not None and measured is not None and after is not None:
        proof = project.prove(measured, after, chosen)
    from planner.report.buying import placed_panels

    return ReportData(
        room=project.room,
        surfaces=project.surfaces,
        materials=project.library,
        target=project.target,
        prediction=project.predict(),
        modes=mode_list(project.modes(REPORTED_MODES_HZ)),
        measurement=None if measured is None else measurement(measured),
        comparison=comparison,
        calibrated=() if calibration is None else calibrated_rows(calibration),
        calibration_words=() if calibration is None else calibration.words,
        options=tuple(options),
        suggestion=suggestion,
        after=None if chosen is None else project.predict(chosen, measured),
        treatment_name="" if chosen is None else chosen.name,
        buying=None if chosen is None else buying(project, chosen),
        panels=()
        if chosen is None
        else tuple(placed_panels(chosen, project.catalogue, project.room)),
        proof=proof,
        acceptance=None if after is None else _acceptance(project, after),
        product_sources=() if chosen is None else _product_sources(project, chosen),
        bibliography=_references(project),
        warnings=project.warnings,
        inputs=tuple(InputFile(path.name, _digest(path)) for path in files),
        version=__version__,
        date="" if measured is None else measured.date,
        timestamp=newest,
        units=project.room.units,
        paper=paper,
    )


def measurement(measured: Measured) -> Measurement:
    """A measurement as it is reported."""
    pairs, decays = max(measured.positions, default=0), max(measured.decays, default=0)
    return Measurement(
        bands_hz=measured.bands_hz,
        t_s=measured.t_s,
        u_s=measured.u_s,
        evaluation=measured.evaluation,
        range_db=measured.range_db,
        flags=measured.flags,
        state=measured.state,
        date=measured.date,
        grade=measured.grade,
        positions=f"{pairs} pairs of source and microphone position, {decays} decays",
        warnings=measured.warnings,
    )


def mode_list(found: RoomModes) -> ModeList:
    """Modes as they are drawn and listed."""
    return ModeList(
        hz=found.modes.hz,
        kinds=found.modes.kinds,
        labels=found.modes.labels,
        t_s=found.modes.t_s,
        schroeder_hz=found.schroeder_hz,
        third_octaves_hz=found.bands_hz,
        third_octave_count=tuple(int(n) for n in found.count),
    )


def calibrated_rows(calibration: Calibration) -> tuple[tuple[str, str, str, str], ...]:
    """Material, band, assumed and fitting coefficient, of what the measurement tells apart."""
    rows = []
    for number, unknown in enumerate(calibration.unknowns):
        for band, hz in enumerate(OCTAVES):
            if not calibration.told_apart[number, band] or hz not in calibration.measured_hz:
                continue
            prior = float(np.asarray(unknown.value)[band])
            value, u = calibration.value[number, band], calibration.u[number, band]
            rows.append((unknown.name, f"{hz} Hz", f"{prior:.2f}", f"{value:.2f} ± {2 * u:.2f}"))
    return tuple(rows)


def _acceptance(project: Project, after: Measured) -> Acceptance:
    from planner.reconcile.octaves import octave_times
    from planner.report.acceptance import judge

    times = octave_times(after)
    none = np.full(len(OCTAVES), np.nan)
    target = project.target
    return judge(
        times.t_s,
        times.u_s,
        none if target is None else target.low,
        none if target is None else target.high,
    )


def _product_sources(project: Project, option: Option) -> tuple[tuple[str, str, str], ...]:
    rows = []
    for name in option.products:
        product = project.catalogue[name]
        alpha = ", ".join(
            f"{a:.2f}{'*' if flag else ''}"
            for a, flag in zip(
                product.coefficients.alpha, product.coefficients.assumed, strict=True
            )
        )
        rows.append((product.description or name, alpha, product.source or "catalogue"))
    return tuple(rows)


def _references(project: Project) -> tuple[str, ...]:
    """Sources of the materials in this room, in full."""
    known = bibliography()
    used: dict[str, None] = {}
    for name in (*project.surfaces.materials, *project.surfaces.items):
        material: Material | None = project.library.get(name)
        if material is not None and material.source:
            used[known.get(material.source, material.source)] = None
    return tuple(used)


def _digest(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()
