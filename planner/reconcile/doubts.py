"""Slips that make a comparison meaningless: units, the room's state, another climate."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.air import Air, energy_attenuation, speed_of_sound
from planner.bands import OCTAVES, exact_midband
from planner.reconcile.words import listed_bands

FEET_PER_METRE = 3.28084
"""[ft/m]"""

SLIPS: tuple[tuple[float, str], ...] = (
    (
        FEET_PER_METRE,
        "the room may have been typed in metres while the file says feet, or one length is "
        "3.28 times too small",
    ),
    (
        1.0 / FEET_PER_METRE,
        "the room may have been typed in feet while the file says metres: check units at the top "
        "of the room file",
    ),
    (1000.0, "the measured times look like milliseconds: write seconds"),
)
"""Ratio measured to predicted that a slip of the unit leaves, and the slip. [-]"""

SLIP_TOLERANCE = 0.20
"""How far the median ratio may lie from that of a slip: rooms are wrong besides, too. [-]"""

CLIMATE_EFFECT = 0.03
"""Change of a reverberation time by the air worth a warning; 5 % can just be heard. [-]"""


def unit_slip(predicted: ArrayLike, measured: ArrayLike) -> str | None:
    """The slip of a unit that would explain measured times, if one would.

    Sabine's and Eyring's times are proportional to length, so a room read in the wrong unit is out
    by the ratio of the units in every band, less at high frequencies where the air takes part.

    Parameters
    ----------
    predicted, measured
        Reverberation times, shape ``(band,)``; NaN where there is none. [s]
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.asarray(measured, float) / np.asarray(predicted, float)
    ratio = ratio[np.isfinite(ratio) & (ratio > 0)]
    if ratio.size < 3:
        return None
    middle, spread = float(np.median(ratio)), float(np.std(np.log(ratio)))
    for slip, words in SLIPS:
        if abs(np.log(middle / slip)) < SLIP_TOLERANCE and spread < 0.35:
            return (
                f"Measured is {middle:.3g} times predicted in the middle of the bands, close to "
                f"{slip:.3g}: {words}."
            )
    return None


def state_doubt(described: str | None, measured: str) -> str | None:
    """Words for a measurement in another state than the described one."""
    if not described or not measured or described == measured:
        return None
    return (
        f"The room was measured {measured} but is described {described}: furniture and people are "
        "part of the difference. Describe the room as it was when it was measured."
    )


def time_in_other_air(time: ArrayLike, here: Air, there: Air) -> NDArray[np.float64]:
    """Reverberation time of a room when only its air changes.

    Parameters
    ----------
    time
        Reverberation time in the air `here`, shape ``(band,)`` over the octaves. [s]
    here, there
        The two states of the air.

    Returns
    -------
    time
        In the air `there`, same shape. [s]

    Notes
    -----
    Both formulas read 1/T = c (A' + 4 m V) / (24 ln(10) V), A' being what surfaces take: with A'
    unchanged the volume drops out.
    """
    c_here = float(speed_of_sound(here.temperature_c))
    c_there = float(speed_of_sound(there.temperature_c))
    k = 24.0 * np.log(10.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        walls = 1.0 / np.asarray(time, float) - 4.0 * _attenuation(here) * c_here / k
        rate = walls * c_there / c_here + 4.0 * _attenuation(there) * c_there / k
        changed: NDArray[np.float64] = 1.0 / rate
    return changed


def _attenuation(air: Air) -> NDArray[np.float64]:
    return energy_attenuation(
        exact_midband(OCTAVES), air.temperature_c, air.humidity_percent, air.pressure_kpa
    )


def climate_doubt(predicted: ArrayLike, described: Air | None, measured: Air | None) -> str | None:
    """Words for a measurement in air so different that it shows in the reverberation time.

    Parameters
    ----------
    predicted
        Reverberation time in the described air, shape ``(band,)`` over the octaves. [s]
    described, measured
        The air of the room file and that of the measurement, where known.
    """
    if described is None or measured is None:
        return None
    time = np.asarray(predicted, float)
    change = time_in_other_air(time, described, measured) / time - 1.0
    far = np.flatnonzero(np.nan_to_num(np.abs(change)) >= CLIMATE_EFFECT)
    if not far.size:
        return None
    most = far[np.argmax(np.abs(change[far]))]
    return (
        f"Measured at {_climate(measured)}, described at {_climate(described)}: the air alone "
        f"changes the time by {change[most]:+.0%} at {listed_bands([OCTAVES[most]])}. Put the "
        "climate of the measurement under [air] to compare like with like."
    )


def _climate(air: Air) -> str:
    return f"{air.temperature_c:g} °C and {air.humidity_percent:g} %"
