"""Measurements that no coefficient should be made to explain."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.errors import MeasuredError
from planner.reconcile.doubts import state_doubt, unit_slip
from planner.reconcile.forward import Shell, time_of
from planner.reconcile.words import listed_bands

Array = NDArray[np.float64]

HOPELESS = 6.0
"""Median distance of measurement and prediction, in standard uncertainties, that is refused. [-]"""


def check_state(described: str | None, measured: str) -> None:
    """Refuse a measurement of another state than the described one.

    Raises
    ------
    MeasuredError
        Both are known and differ.
    """
    doubt = state_doubt(described, measured)
    if doubt:
        raise MeasuredError(
            doubt.split(": ")[0],
            where="state",
            cure="Describe the room as it was measured, or measure it as it is described.",
        )


def check_times(measured: Array, predicted: Array, room: Shell) -> None:
    """Refuse times that are missing, in another unit, or longer than the air alone allows.

    Parameters
    ----------
    measured, predicted
        Shape ``(band,)``; NaN where not measured. [s]
    room
        The shell.

    Raises
    ------
    MeasuredError
        With the band and what to check.
    """
    if not np.isfinite(measured).any():
        raise MeasuredError(
            "no band has a reverberation time",
            cure="Measure again with more level above the background noise.",
        )
    slip = unit_slip(predicted, measured)
    if slip:
        raise MeasuredError(
            slip.rstrip("."), cure="Put the unit right; coefficients cannot explain that."
        )
    with np.errstate(divide="ignore"):
        longest = time_of(room, np.zeros(len(OCTAVES)), "sabine")
    beyond = np.flatnonzero(np.nan_to_num(measured) > 1.5 * longest)
    if beyond.size:
        band = beyond[0]
        raise MeasuredError(
            f"{measured[band]:.2f} s at {listed_bands([OCTAVES[band]])} is longer than the air "
            f"alone allows, {longest[band]:.2f} s",
            cure="Check the recording for background noise, and temperature and humidity.",
        )


def check_distance(observed: Array, expected: Array, spread: Array) -> None:
    """Refuse a room that absorbs so much more or less that it must be another room.

    Parameters
    ----------
    observed, expected
        Absorption areas measured and described, shape ``(band,)``. [m²]
    spread
        Standard uncertainty of their difference, shape ``(band,)``. [m²]

    Raises
    ------
    MeasuredError
        They differ by more than `HOPELESS` in the middle of the bands.
    """
    middle = float(np.median((observed - expected) / spread))
    if abs(middle) <= HOPELESS:
        return
    more = "more" if middle > 0 else "less"
    raise MeasuredError(
        f"the room absorbs {observed.mean():.1f} m² where {expected.mean():.1f} m² are described, "
        f"{abs(middle):.0f} standard uncertainties {more}: no plausible coefficient explains that",
        cure="Check that this is the room that was measured: its size, its materials, what stood "
        "in it.",
    )
