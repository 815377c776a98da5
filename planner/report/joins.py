"""From what the other folders worked out to what a report prints."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from planner.bands import OCTAVES
from planner.report.charts_decay import DecayCurve
from planner.report.report_data import Alternative, InputFile, Measurement, ModeList

if TYPE_CHECKING:
    from planner.measure.figures import BandDecay
    from planner.measure.measured import Measured
    from planner.predict.prediction import Prediction
    from planner.predict.room_modes import RoomModes
    from planner.reconcile.calibration import Calibration
    from planner.room.surfaces import RoomSurfaces
    from planner.treat.catalogue import Catalogue
    from planner.treat.option import Option
    from planner.treat.shopping import ShoppingList


def measurement_of(measured: Measured) -> Measurement:
    """A measurement with its grade, positions and the remarks on its recordings."""
    pairs, decays = max(measured.positions, default=0), max(measured.decays, default=0)
    remarks = [f"{note.file}: {text}" for note in measured.recordings for text in note.warnings]
    positions = ""
    if pairs:
        positions = (
            f"up to {pairs} pair{'s' * (pairs != 1)} of source and microphone position, "
            f"{decays} decay{'s' * (decays != 1)} in all"
        )
    return Measurement(
        bands_hz=tuple(measured.bands_hz),
        t_s=measured.t_s,
        u_s=measured.u_s,
        evaluation=measured.evaluation,
        range_db=measured.range_db,
        flags=measured.flags,
        state=measured.state,
        date=measured.date,
        grade=f"{measured.grade} (ISO 3382-2)" if measured.grade else "",
        positions=positions,
        warnings=(*measured.warnings, *remarks),
    )


def decay_picture(band: BandDecay) -> DecayCurve:
    """The decay of one band as `planner.report.charts.decay` draws it."""
    curve = band.curve
    line = next((entry for entry in curve.lines if entry[0] == band.used), None)
    slope, start, span = None, 0.0, None
    if line is not None:
        _, start_s, start_db, end_s, end_db = line
        slope = (end_db - start_db) / (end_s - start_s)
        start, span = start_db - slope * start_s, (start_db, end_db)
    whole = band.used == "whole-decay"
    floor = band.floor_db - band.level_db
    return DecayCurve(
        time_s=curve.time_s,
        level_db=curve.level_db,
        range_db=span,
        slope_db_per_s=slope,
        start_db=start,
        floor_db=floor if np.isfinite(floor) else None,
        label="T by the whole decay" if whole else band.used.upper() or "T",
        fitted_db=curve.fitted_db if whole else None,
        t_s=float(band.t_s),
    )


def mode_list(found: RoomModes) -> ModeList:
    """The modes of a room as they are drawn and listed."""
    known = bool(np.isfinite(found.modes.t_s).any())
    return ModeList(
        hz=found.modes.hz,
        kinds=found.modes.kinds,
        labels=found.modes.labels,
        t_s=found.modes.t_s if known else None,
        schroeder_hz=found.schroeder_hz,
        third_octaves_hz=tuple(found.bands_hz),
        third_octave_count=tuple(int(n) for n in found.count),
    )


def calibrated_rows(
    calibration: Calibration, *, most: int = 24
) -> tuple[tuple[str, str, str, str], ...]:
    """Material, band, assumed and fitted coefficient, where the measurement moved it most.

    Only what the measurement tells apart is listed, by how many of its standard uncertainties a
    coefficient moved.
    """
    rows = []
    for n, unknown in enumerate(calibration.unknowns[:-1]):
        moved = np.abs(calibration.value[n] - unknown.value) / np.maximum(unknown.u, 1e-9)
        for band, hz in enumerate(OCTAVES):
            if calibration.told_apart[n, band]:
                assumed = f"{unknown.value[band]:.2f} ± {unknown.u[band]:.2f}"
                fits = f"{calibration.value[n, band]:.2f} ± {calibration.u[n, band]:.2f}"
                rows.append((float(moved[band]), (unknown.name, f"{hz} Hz", assumed, fits)))
    rows.sort(key=lambda row: -row[0])
    return tuple(row for _, row in rows[:most])


def alternative(
    option: Option,
    prediction: Prediction,
    bought: ShoppingList,
    catalogue: Catalogue,
    before: RoomSurfaces,
    after: RoomSurfaces,
    *,
    chosen: bool = False,
    note: str = "",
) -> Alternative:
    """One option of the comparison.

    Parameters
    ----------
    option
        The treatment.
    prediction
        Of the room with it in place.
    bought
        What has to be bought for it.
    catalogue
        Where its products stand.
    before, after
        The room without and with it.
    chosen
        Is it the one that the report is about.
    note
        A remark on it.
    """
    gained = after.absorption_area - before.absorption_area
    depths = [catalogue[name].depth_mm for name in option.products if name in catalogue]
    known = [depth for depth in depths if depth is not None]
    outside = tuple(
        hz for hz, misses in zip(OCTAVES, np.asarray(prediction.outside), strict=True) if misses
    )

    def per_area(hz: int) -> float | None:
        added = float(gained[OCTAVES.index(hz)])
        return None if bought.total is None or added <= 0.01 else bought.total / added

    return Alternative(
        name=option.name,
        predicted=np.asarray(prediction.time, float),
        cost=bought.total,
        probability=prediction.probability,
        outside_hz=outside,
        depth_mm=max(known) if known else None,
        area_m2=bought.area_m2,
        cost_per_m2_125=per_area(125),
        cost_per_m2_1000=per_area(1000),
        chosen=chosen,
        note=note,
    )


def product_sources(option: Option, catalogue: Catalogue) -> tuple[tuple[str, str, str], ...]:
    """Each product of an option with its coefficients (assumed ones in brackets) and its source."""
    rows = []
    for name in option.products:
        product = catalogue[name]
        values = zip(product.coefficients.alpha, product.coefficients.assumed, strict=True)
        words = " ".join(
            f"({alpha:.2f})" if assumed else f"{alpha:.2f}" for alpha, assumed in values
        )
        rows.append((product.description or name, words, product.source or "no source given"))
    return tuple(rows)


def input_files(paths: Iterable[str | Path]) -> tuple[InputFile, ...]:
    """Names and SHA-256 digests of the files a report is made from, in the order given."""
    files = []
    for path in paths:
        digest = hashlib.sha256()
        with Path(path).open("rb") as stream:
            while block := stream.read(1 << 20):
                digest.update(block)
        files.append(InputFile(Path(path).name, digest.hexdigest()))
    return tuple(files)
