"""Which coefficients must be off: a Bayesian update of the material data from a measured room.

Before the measurement each coefficient is what its table says, as uncertain as its table is, and
smooth over neighbouring octaves (`planner.reconcile.prior`). The measured times fix the absorption
area of every band (`planner.reconcile.forward`). The update is a bounded linear least-squares
problem; what it leaves unknown stays as a covariance, from which `Calibration.draws` samples.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.predict.reverberation import LARGEST_ALPHA
from planner.reconcile.calibration import Calibration
from planner.reconcile.forward import (
    area_of,
    area_uncertainty,
    formula_uncertainty,
    shell,
    time_of,
)
from planner.reconcile.octaves import octave_times
from planner.reconcile.posterior import BoxedNormal
from planner.reconcile.prior import BANDS, Unknown, carried_over, counted, prior_of, unknowns
from planner.reconcile.refusals import check_distance, check_state, check_times
from planner.room.surfaces import RoomSurfaces

if TYPE_CHECKING:
    from planner.absorption.library import Library
    from planner.air import Air
    from planner.measure.measured import Measured
    from planner.room.model import Room

Array = NDArray[np.float64]

INTERVAL_DRAWS = 600
"""Draws behind the stated intervals."""


def calibrate(
    surfaces: RoomSurfaces,
    air: Air,
    measured: Measured,
    *,
    formula: str = "eyring",
    state: str | None = None,
    prior: Calibration | None = None,
) -> Calibration:
    """Correct the coefficients of a room by its measured reverberation times.

    Parameters
    ----------
    surfaces
        The room as it was measured, untreated or with a treatment in place.
    air
        Its air; where the measurement states its own, that is used.
    measured
        In octaves or one-third octaves; bands without a value are left to their neighbours.
    formula
        ``eyring``, ``sabine``, or ``both`` (then Eyring's).
    state
        The state that the room file describes, compared with that of the measurement.
    prior
        What an earlier state of the same room taught, by the same formula.

    Returns
    -------
    calibration

    Raises
    ------
    MeasuredError
        The measurement is of another state, in another unit, has no usable band, or lies so far
        from the prediction that no coefficient can explain it.

    Notes
    -----
    The measurement's uncertainty is widened by that of the formula (`formula_uncertainty`), taken
    as independent from band to band. For Eyring a coefficient above 0.99 counts as 0.99, so the
    problem is linear in pieces: it is solved once with such coefficients held there and once with
    them free, and the better fit is taken.
    """
    name = "eyring" if formula == "both" else formula
    if prior is not None and prior.formula != name:
        raise ValueError(f"calibrated by {prior.formula}, not by {name}")
    times = octave_times(measured)
    room = shell(surfaces, measured.air or air)
    rows = unknowns(surfaces, name)
    check_state(state, measured.state)
    predicted = time_of(room, _area(rows, np.array([row.value for row in rows]), name), name)
    check_times(times.t_s, predicted, room)
    relative = formula_uncertainty(room, area_of(room, times.t_s, name), times.t_s)
    measured_u = np.hypot(times.u_s, relative * times.t_s)
    start = prior_of(rows)
    if prior is not None:
        start = carried_over(rows, prior.unknowns, prior.posterior)
    bands = np.flatnonzero(np.isfinite(times.t_s))
    observed = area_of(room, times.t_s, name)[bands]
    observed_u = area_uncertainty(room, times.t_s, measured_u, name)[bands]
    _check_against(rows, start, bands, observed, observed_u, name)
    posterior, value = _fit(rows, start, bands, observed, observed_u, name)
    shape = (len(rows), BANDS)
    draws = posterior.draws(INTERVAL_DRAWS, seed=0).reshape(INTERVAL_DRAWS, *shape)
    value = value.reshape(shape)
    low, high = np.quantile(draws, [0.025, 0.975], axis=0)
    before, after = np.diag(start.covariance), np.diag(posterior.covariance)
    if prior is not None:
        before = np.diag(prior_of(rows).covariance)
    return Calibration(
        formula=name,
        described=surfaces,
        shell=room,
        unknowns=rows,
        posterior=posterior,
        value=value,
        u=draws.std(axis=0, ddof=1),
        interval=np.array([np.minimum(low, value), np.maximum(high, value)]),
        reduction=(1.0 - after / before).reshape(shape),
        measured=times.t_s,
        measured_u=measured_u,
        predicted=predicted,
        fitted=time_of(room, _area(rows, value, name), name),
        warnings=times.warnings,
    )


def calibrate_room(
    room: Room, measured: Measured, *, library: Library | None = None
) -> Calibration:
    """`calibrate` for a room file: its formula, air and described state.

    Raises
    ------
    MeasuredError
        As `calibrate`.
    """
    from planner.room.surfaces import room_surfaces

    return calibrate(
        room_surfaces(room, library),
        room.air_state(),
        measured,
        formula=room.treatment.formula,
        state=room.described_state,
    )


def _area(rows: tuple[Unknown, ...], value: Array, formula: str) -> Array:
    """Absorption area as the formula counts it, shape ``(band,)``. [m²]."""
    area = np.zeros(BANDS)
    for row, one in zip(rows, value, strict=True):
        area += row.amount * (counted(one, formula) if row.kind == "material" else one)
    return area


def _fit(
    rows: tuple[Unknown, ...],
    start: BoxedNormal,
    bands: NDArray[np.intp],
    observed: Array,
    observed_u: Array,
    formula: str,
) -> tuple[BoxedNormal, Array]:
    """Posterior and best point, shape ``(unknown · band,)``."""
    shape = (len(rows), BANDS)
    above = np.zeros(shape, bool)
    if formula == "eyring":
        is_material = np.array([row.kind == "material" for row in rows])[:, None]
        above = is_material & (start.mean.reshape(shape) > LARGEST_ALPHA)
    best: tuple[float, BoxedNormal, Array] | None = None
    for held in [above, np.zeros(shape, bool)][: 2 if above.any() else 1]:
        design, fixed = _design(rows, held, bands)
        posterior = start.updated(design, observed - fixed, observed_u)
        value = posterior.most_likely()
        residual = (_area(rows, value.reshape(shape), formula)[bands] - observed) / observed_u
        off = np.linalg.solve(start.factor, value - start.mean)
        misfit = float(residual @ residual + off @ off)
        if best is None or misfit < best[0]:
            best = (misfit, posterior, value)
    assert best is not None
    return best[1], best[2]


def _design(
    rows: tuple[Unknown, ...], held: NDArray[np.bool_], bands: NDArray[np.intp]
) -> tuple[Array, Array]:
    """Which unknown adds how much to which observed band, and what those held at 0.99 add."""
    design = np.zeros((bands.size, len(rows), BANDS))
    fixed = np.zeros(bands.size)
    for number, row in enumerate(rows):
        free = ~held[number, bands]
        design[np.arange(bands.size), number, bands] = row.amount * free
        fixed += row.amount * LARGEST_ALPHA * ~free
    return design.reshape(bands.size, -1), fixed


def _check_against(
    rows: tuple[Unknown, ...],
    start: BoxedNormal,
    bands: NDArray[np.intp],
    observed: Array,
    observed_u: Array,
    formula: str,
) -> None:
    """Refuse a measurement beyond what the prior makes plausible."""
    design, _ = _design(rows, np.zeros((len(rows), BANDS), bool), bands)
    expected = _area(rows, start.mean.reshape(len(rows), BANDS), formula)[bands]
    spread = np.sqrt(np.einsum("bi,ij,bj->b", design, start.covariance, design) + observed_u**2)
    check_distance(observed, expected, spread)
