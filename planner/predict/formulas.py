"""The formulas on a room: which of its arrays each of them takes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.air import Air, energy_attenuation, speed_of_sound
from planner.bands import OCTAVES, exact_midband
from planner.predict import reverberation as formula
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

METHODS: tuple[str, ...] = (
    "sabine", "eyring", "millington_sette", "kuttruff", "fitzroy", "arau_puchades",
)  # fmt: skip
"""Every formula, in the order in which tables list them."""


@dataclass(frozen=True, slots=True)
class Inputs:
    """What the formulas take: one room, or many variants of it on leading axes."""

    volume: Array
    """Of air, shape ``(...)``. [m³]"""
    area: Array
    """Shape ``(..., part)``. [m²]"""
    alpha: Array
    """Shape ``(..., part, band)``. [-]"""
    normal: Array
    """Shape ``(part, 3)``."""
    item_area: Array
    """Absorption area of all furnishings, shape ``(..., band)``. [m²]"""
    air_attenuation: Array
    """Shape ``(..., band)``. [1/m]"""
    speed: Array
    """Shape ``(...)``. [m/s]"""

    @property
    def surface_area(self) -> Array:
        """Shape ``(...)``. [m²]."""
        total: Array = self.area.sum(axis=-1)
        return total

    def absorption_area(self, alpha: Array) -> Array:
        """Σ S α of these coefficients and the furnishings, shape ``(..., band)``. [m²]."""
        walls: Array = np.matmul(self.area[..., None, :], alpha)[..., 0, :]
        return walls + self.item_area


def inputs_of(surfaces: RoomSurfaces, air: Air) -> Inputs:
    """The formulas' view of a room; hard objects take their volume from the air (EN 12354-6)."""
    return Inputs(
        volume=np.asarray(surfaces.volume - surfaces.object_volume),
        area=surfaces.area,
        alpha=surfaces.alpha,
        normal=np.array([part.normal for part in surfaces.parts]),
        item_area=surfaces.item_count @ surfaces.item_area,
        air_attenuation=energy_attenuation(
            exact_midband(OCTAVES), air.temperature_c, air.humidity_percent, air.pressure_kpa
        ),
        speed=np.asarray(speed_of_sound(air.temperature_c)),
    )


def reverberation_time(method: str, room: Inputs) -> Array:
    """Reverberation time by one of `METHODS`, shape ``(..., band)``. [s].

    Sabine takes coefficients as they are; the logarithmic formulas cap them at 0.99.
    """
    volume, speed = room.volume[..., None], room.speed[..., None]
    surface = room.surface_area[..., None]
    m = room.air_attenuation
    if method == "sabine":
        area = room.absorption_area(room.alpha)
        return formula.sabine(volume, area, air_attenuation=m, speed_of_sound=speed)
    limited = formula.capped(room.alpha)
    if method == "eyring":
        mean = room.absorption_area(limited) / surface
        return formula.eyring(volume, surface, mean, air_attenuation=m, speed_of_sound=speed)
    if method == "kuttruff":
        mean = room.absorption_area(limited) / surface
        return formula.kuttruff(
            volume,
            surface,
            mean,
            unevenness=formula.uneven_absorption(room.area, limited),
            air_attenuation=m,
            speed_of_sound=speed,
        )
    if method == "millington_sette":
        return formula.millington_sette(
            volume,
            room.area,
            limited,
            further_area=room.item_area,
            air_attenuation=m,
            speed_of_sound=speed,
        )
    directional = {"fitzroy": formula.fitzroy, "arau_puchades": formula.arau_puchades}[method]
    areas, means = formula.axis_shares(room.area, room.normal, limited, further_area=room.item_area)
    return directional(
        volume[..., None],
        areas,
        means,
        air_attenuation=m[..., None, :],
        speed_of_sound=speed[..., None],
    )
