"""From reverberation-time limits to limits on absorption area: the step that makes it linear.

Once the time is fixed, Sabine and Eyring are linear in the areas of the surfaces:

- Sabine: A = Σ S α must lie between k V / T_high − 4 m V and k V / T_low − 4 m V;
- Eyring: Σ S min(α, 0.99) between S (1 − exp(−(k V / T − 4 m V) / S)) of the same two times;

with k = 24 ln 10 / c.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.air import Air, energy_attenuation, speed_of_sound
from planner.bands import OCTAVES, exact_midband
from planner.predict.reverberation import LARGEST_ALPHA, area_from_time
from planner.predict.targets import TargetLimits
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Windows:
    """Between which limits the absorption area must lie, by one formula."""

    formula: str
    """``sabine`` or ``eyring``."""
    low: Array
    """Shape ``(band,)``; −inf where the time may be as long as it likes. [m²]"""
    high: Array
    """Shape ``(band,)``; inf where the time may be as short as it likes. [m²]"""

    def narrowed(self, low_by: ArrayLike, high_by: ArrayLike) -> Windows:
        """The same with both ends moved inwards, at most to 45 % of the width from each. [m²]."""
        width = np.where(
            np.isfinite(self.low) & np.isfinite(self.high), self.high - self.low, np.inf
        )
        most = 0.45 * width
        return Windows(
            self.formula,
            self.low + np.minimum(np.asarray(low_by, float), most),
            self.high - np.minimum(np.asarray(high_by, float), most),
        )


def formulas(choice: str) -> tuple[str, ...]:
    """Formulas behind the room file's word ``eyring``, ``sabine`` or ``both``."""
    return ("eyring", "sabine") if choice == "both" else (choice,)


def absorption_area(surfaces: RoomSurfaces, formula: str) -> Array:
    """Absorption area as a formula counts it, shape ``(band,)``. [m²]."""
    panels: Array = surfaces.area @ counted(surfaces.alpha, formula)
    things: Array = surfaces.item_count @ surfaces.item_area
    return panels + things


def counted(alpha: ArrayLike, formula: str) -> Array:
    """Coefficients as a formula counts them: as they are, or capped for Eyring. [-]."""
    values = np.asarray(alpha, float)
    return np.minimum(values, LARGEST_ALPHA) if formula == "eyring" else values


def effective_volume(surfaces: RoomSurfaces) -> float:
    """Volume of air: hard objects take theirs away (EN 12354-6:2003, formula 3). [m³]."""
    return surfaces.volume - surfaces.object_volume


def windows(
    surfaces: RoomSurfaces, air: Air, low: ArrayLike, high: ArrayLike, names: Sequence[str]
) -> tuple[Windows, ...]:
    """Limits on the absorption area for limits on the reverberation time.

    Parameters
    ----------
    surfaces
        The untreated room; of it only volume and surface area matter.
    air
        State of the air.
    low, high
        Shortest and longest reverberation time, shape ``(band,)``, NaN where there is none. [s]
    names
        Formulas.
    """
    shortest, longest = np.asarray(low, float), np.asarray(high, float)
    found = []
    for name in names:
        least, most = (area_behind(name, t, surfaces, air) for t in (longest, shortest))
        found.append(
            Windows(
                name,
                np.where(np.isnan(least), -np.inf, least),
                np.where(np.isnan(most), np.inf, most),
            )
        )
    return tuple(found)


def area_behind(formula: str, times: ArrayLike, surfaces: RoomSurfaces, air: Air) -> Array:
    """Absorption area that gives a room of this size the times `times`, shape of `times`. [m²]."""
    return area_from_time(
        formula,
        times,
        effective_volume(surfaces),
        float(surfaces.area.sum()),
        air_attenuation=air_m(air),
        speed_of_sound=speed_of_sound(air.temperature_c),
    )


def air_m(air: Air) -> Array:
    """Energy attenuation of the air at the exact octave midbands, shape ``(band,)``. [1/m]."""
    return energy_attenuation(
        exact_midband(OCTAVES), air.temperature_c, air.humidity_percent, air.pressure_kpa
    )


def judged_bands(
    target: TargetLimits, surfaces: RoomSurfaces, *, include_assumed: bool = False
) -> NDArray[np.bool_]:
    """Bands that decide: the target has a limit there and the room's data are not assumed.

    Bands with assumed coefficients are predicted and shown, but a verdict must not rest on them;
    `include_assumed` lets them decide all the same.
    """
    limited = np.isfinite(target.low) | np.isfinite(target.high)
    if include_assumed:
        return np.asarray(limited, bool)
    known = np.array([hz not in surfaces.assumed_hz for hz in OCTAVES])
    return np.asarray(limited & known, bool)
