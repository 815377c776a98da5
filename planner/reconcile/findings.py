"""A calibration in words and as JSON."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.reconcile.words import json_list, listed_bands

if TYPE_CHECKING:
    from planner.reconcile.calibration import Calibration

MOST_NAMED = 6
"""Assumptions named at most."""

WORTH_NAMING = 1.0
"""Shift in standard uncertainties of the prior from which an assumption is called wrong. [-]"""

WEIGHTY = 0.15
"""Share of what is unknown in a band that a material must carry to be spoken of. [-]"""


def findings(calibration: Calibration) -> tuple[str, ...]:
    """Assumptions most likely wrong, what stays unexplained, and what cannot be told apart."""
    wrong = _most_likely_wrong(calibration)
    if not wrong:
        wrong = ["No assumption stands out: the tables fit the measured times within uncertainty."]
    return (*wrong, *_unexplained(calibration), *_not_told_apart(calibration))


def shifts(calibration: Calibration) -> NDArray[np.float64]:
    """Best fit less prior in standard uncertainties of the prior, ``(unknown, band)``. [-]."""
    prior = np.array([row.value for row in calibration.unknowns])
    prior_u = np.array([row.u for row in calibration.unknowns])
    result: NDArray[np.float64] = (calibration.value - prior) / prior_u
    return result


def _most_likely_wrong(calibration: Calibration) -> list[str]:
    size = np.abs(shifts(calibration)[:-1])
    size[:, ~np.isfinite(calibration.measured)] = 0.0
    order = np.argsort(-size, axis=None, kind="stable")[:MOST_NAMED]
    lines = []
    for number, band in zip(*np.unravel_index(order, size.shape), strict=True):
        if size[number, band] < WORTH_NAMING:
            break
        row = calibration.unknowns[number]
        unit = "" if row.kind == "material" else " m² each"
        lines.append(
            f"{row.name} at {OCTAVES[band]} Hz: {row.value[band]:.2f} assumed, "
            f"{calibration.value[number, band]:.2f} ± {calibration.u[number, band]:.2f}{unit} fits."
        )
    return lines


def _unexplained(calibration: Calibration) -> list[str]:
    rest, u = calibration.value[-1], calibration.u[-1]
    clear = np.isfinite(calibration.measured) & (np.abs(rest) > 2.0 * u)
    return [
        f"At {OCTAVES[band]} Hz {abs(rest[band]):.1f} ± {u[band]:.1f} m² "
        + (
            "are absorbed by something that is not listed."
            if rest[band] > 0
            else "less are absorbed than by any plausible coefficients of what is listed."
        )
        for band in np.flatnonzero(clear)
    ]


def _not_told_apart(calibration: Calibration) -> list[str]:
    """One sentence for each pair of materials whose sum alone is measured."""
    from planner.reconcile.calibration import CONFUSED

    correlation, told = calibration.correlation, calibration.told_apart
    amount = np.array([row.amount for row in calibration.unknowns])
    weight = (amount[:, None] * np.array([row.u for row in calibration.unknowns])) ** 2
    weighty = weight >= WEIGHTY * weight.sum(axis=0)
    measured = np.isfinite(calibration.measured)
    lines = []
    for one in range(len(amount) - 1):
        for other in range(one + 1, len(amount) - 1):
            together = measured & weighty[one] & weighty[other] & ~(told[one] & told[other])
            together &= correlation[:, one, other] < CONFUSED
            if together.any():
                bands = listed_bands(np.array(OCTAVES)[together])
                lines.append(
                    f"The measurement cannot tell {calibration.names[one]} and "
                    f"{calibration.names[other]} apart at {bands}: it fixes their sum."
                )
    return lines


def calibration_json(calibration: Calibration) -> dict[str, Any]:
    """The promised key ``calibrated``, the unexplained rest and the words."""
    low, high = calibration.interval
    entries = [
        {
            "material": row.name,
            "kind": row.kind,
            "unit": "1" if row.kind == "material" else "m2",
            "amount": row.amount,
            "prior": json_list(row.value),
            "prior_u": json_list(row.u),
            "posterior": json_list(calibration.value[number]),
            "u": json_list(calibration.u[number]),
            "low": json_list(low[number]),
            "high": json_list(high[number]),
            "told_apart": calibration.told_apart[number].tolist(),
        }
        for number, row in enumerate(calibration.unknowns[:-1])
    ]
    return {
        "calibrated": entries,
        "unexplained_m2": json_list(calibration.value[-1]),
        "unexplained_u_m2": json_list(calibration.u[-1]),
        "fitted": json_list(calibration.fitted),
        "calibration_words": list(calibration.words),
    }
