"""What surfaces take from the sound: tables and layers enter, coefficients per octave leave.

A coefficient comes with its standard uncertainty, and with a mark where no source gives it.
"""

from planner.absorption.library import (
    Coefficients,
    Library,
    Material,
    builtin,
    coefficients,
    material_from_values,
)

__all__ = [
    "Coefficients",
    "Library",
    "Material",
    "builtin",
    "coefficients",
    "material_from_values",
]
