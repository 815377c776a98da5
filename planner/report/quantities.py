"""Quantities as people read them, metric or imperial throughout one paper."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from fractions import Fraction

from planner.room.lengths import METRES_PER, feet_and_inches

POUND = 0.45359237
"""International pound, exact by definition. [kg]"""
NONE = "–"
"""What stands where there is no value."""


@dataclass(frozen=True, slots=True)
class Quantities:
    """Writes lengths, areas, weights and temperatures in one system of units."""

    units: str = "m"
    """``m`` for metric, ``ft`` for imperial."""

    @property
    def imperial(self) -> bool:
        """Feet, pounds and degrees Fahrenheit."""
        return self.units == "ft"

    def length(self, metres: float | None) -> str:
        """``3.75 m`` or ``12' 3 5/8"``."""
        if metres is None or not math.isfinite(metres):
            return NONE
        return feet_and_inches(metres) if self.imperial else f"{metres:.2f} m"

    def small(self, millimetres: float | None) -> str:
        """``50 mm`` or ``1 15/16"``, to a sixteenth of an inch."""
        if millimetres is None or not math.isfinite(millimetres):
            return NONE
        if self.imperial:
            whole, rest = divmod(round(millimetres / 25.4 * 16), 16)
            parts = [str(whole)] * bool(whole or not rest) + [str(Fraction(rest, 16))] * bool(rest)
            return f'{" ".join(parts)}"'
        return f"{millimetres:.0f} mm"

    def cut(self, metres: float) -> str:
        """A length to saw: ``1200 mm`` or ``3' 11 1/4"``."""
        return feet_and_inches(metres) if self.imperial else f"{round(metres * 1000, 1):g} mm"

    def size(self, width: float, height: float) -> str:
        """``600 × 1200 mm`` or the same in feet and inches."""
        if self.imperial:
            return f"{feet_and_inches(width)} × {feet_and_inches(height)}"
        return f"{width * 1000:.0f} × {height * 1000:.0f} mm"

    def area(self, square_metres: float | None) -> str:
        """``4.32 m²`` or ``46.5 ft²``."""
        if square_metres is None or not math.isfinite(square_metres):
            return NONE
        if self.imperial:
            return f"{square_metres / METRES_PER['ft'] ** 2:.1f} ft²"
        return f"{square_metres:.2f} m²"

    @property
    def area_unit(self) -> str:
        """``m²`` or ``ft²``."""
        return "ft²" if self.imperial else "m²"

    def bare_area(self, square_metres: float) -> str:
        """An area without its unit, for a column that names it."""
        return self.area(square_metres).removesuffix(f" {self.area_unit}")

    def sentence(self, text: str) -> str:
        """A finished sentence with its areas and weights in these units; they round up.

        ``allow 2.4 m² more`` becomes ``allow 25.9 ft² more``.
        """

        def converted(found: re.Match[str]) -> str:
            per, unit = (METRES_PER["ft"] ** 2, "ft²") if found[2] == "m²" else (POUND, "lb")
            return f"{math.ceil(float(found[1]) / per * 10 - 1e-6) / 10:.1f} {unit}"

        return (
            re.sub(r"(\d+(?:\.\d+)?) (m²|kg)(?![\w²/])", converted, text) if self.imperial else text
        )

    def volume(self, cubic_metres: float) -> str:
        """``52.7 m³`` or ``1862 ft³``."""
        if self.imperial:
            return f"{cubic_metres / METRES_PER['ft'] ** 3:.0f} ft³"
        return f"{cubic_metres:.1f} m³"

    def weight(self, kilograms: float | None) -> str:
        """``12.5 kg`` or ``27.6 lb``."""
        if kilograms is None or not math.isfinite(kilograms):
            return NONE
        return f"{kilograms / POUND:.1f} lb" if self.imperial else f"{kilograms:.1f} kg"

    def temperature(self, celsius: float) -> str:
        """``21.0 °C`` or ``69.8 °F``."""
        return f"{celsius * 1.8 + 32:.1f} °F" if self.imperial else f"{celsius:.1f} °C"

    def speed(self, metres_per_second: float) -> str:
        """``343.2 m/s`` or ``1126 ft/s``."""
        if self.imperial:
            return f"{metres_per_second / METRES_PER['ft']:.0f} ft/s"
        return f"{metres_per_second:.1f} m/s"


def money(amount: float | None, currency: str = "") -> str:
    """``1,234.50 EUR``, a dash where there is no price."""
    if amount is None or not math.isfinite(amount):
        return NONE
    return f"{amount:,.2f} {currency}".strip()


def seconds(value: float | None, digits: int = 2) -> str:
    """``0.31``, a dash where there is no value. [s]."""
    if value is None or not math.isfinite(value):
        return NONE
    return f"{value:.{digits}f}"
