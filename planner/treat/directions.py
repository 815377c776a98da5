"""Arau-Puchades' formula as a function of the amounts chosen, and as rows of the programme."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.air import speed_of_sound
from planner.predict.reverberation import capped, decaying_area
from planner.treat.task import Task
from planner.treat.treatment import Axial
from planner.treat.windows import air_m, effective_volume

Array = NDArray[np.float64]

KNOTS = np.concatenate([np.geomspace(0.01, 0.3, 7), [0.4, 0.5, 0.62]])
"""Mean coefficients of an axis where tangents touch. [-]"""


@dataclass(frozen=True, slots=True)
class Directions:
    """The time of a room as a function of the amounts.

    −ln(T / k V) is a sum over the axes of w ln(−S ln(1 − a) + 4 m V), with a linear in the
    amounts; each term is concave in a up to 0.63, where its tangents lie above it.
    """

    start: Array
    """Mean coefficient of each axis without treatment, shape ``(3, band)``. [-]"""
    slope: Array
    """Per unit of each choice, shape ``(choice, 3, band)``. [-]"""
    weight: Array
    """Share of each axis in the surface, shape ``(3, 1)``. [-]"""
    surface: float
    """[m²]"""
    air_area: Array
    """4 m V, shape ``(band,)``. [m²]"""
    decay_area: float
    """k V. [m² s]"""

    def alpha(self, amounts: Array) -> Array:
        """Mean coefficients, shape ``(3, band)``. [-]."""
        alpha: Array = self.start + np.einsum("c,cjb->jb", amounts, self.slope)
        return capped(alpha)

    def decay(self, alpha: Array) -> Array:
        """−S ln(1 − a) + 4 m V, shape of `alpha`. [m²]."""
        decay: Array = -self.surface * np.log1p(-alpha) + self.air_area
        return decay

    def times(self, amounts: Array) -> Array:
        """Reverberation times, shape ``(band,)``. [s]."""
        logs = np.log(self.decay_area / self.decay(self.alpha(amounts)))
        times: Array = np.exp(np.sum(self.weight * logs, axis=0))
        return times

    def steepness(self, alpha: Array) -> Array:
        """Derivative of w ln(decay) by a, shape of `alpha`."""
        steep: Array = self.weight * self.surface / ((1.0 - alpha) * self.decay(alpha))
        return steep

    def slopes(self, amounts: Array) -> Array:
        """Of −ln T per unit of each choice, shape ``(choice, band)``."""
        steep = self.steepness(self.alpha(amounts))
        slopes: Array = np.einsum("jb,cjb->cb", steep, self.slope)
        return slopes

    def below(self, high: Array) -> Axial:
        """T ≤ high as rows, shape ``(band,)``; NaN where there is no limit. [s]."""
        alpha = np.broadcast_to(KNOTS[:, None, None], (len(KNOTS), *self.start.shape))
        least = np.log(self.decay_area / high)
        return Axial(
            start=self.start,
            slope=self.slope,
            knots=KNOTS,
            value=self.weight * np.log(self.decay(alpha)),
            steepness=self.steepness(alpha),
            least=np.where(np.isfinite(least), least, -np.inf),
        )


def directions_of(task: Task) -> Directions:
    """The formula for one room and its choices."""
    surfaces, asked = task.surfaces, task.problem
    size, start, effect = asked.axis_areas("eyring")
    surface, volume = float(surfaces.area.sum()), effective_volume(surfaces)
    divisor = np.where(size > 0, size, 1.0)[:, None]
    lone = asked.standing_effect() / surface
    return Directions(
        start=start / divisor + surfaces.item_count @ surfaces.item_area / surface,
        slope=effect / divisor + lone[:, None, :],
        weight=(size / size.sum())[:, None],
        surface=surface,
        air_area=4.0 * air_m(task.air) * volume,
        decay_area=float(
            decaying_area(volume, 1.0, speed_of_sound=speed_of_sound(task.air.temperature_c))
        ),
    )
