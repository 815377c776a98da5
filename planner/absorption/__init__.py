"""What surfaces take from the sound: tables and layers enter, coefficients per octave leave.

A coefficient comes with its standard uncertainty, and with a mark where no source gives it.
"""

from planner.absorption.build_up import BuildUp, material_from_build_up
from planner.absorption.build_up_text import layers_from_text, text_of_layers
from planner.absorption.library import (
    Coefficients,
    Library,
    Material,
    builtin,
    coefficients,
    material_from_values,
)
from planner.absorption.ratings import Rating, Ratings, nrc, saa, weighted

__all__ = [
    "BuildUp",
    "Coefficients",
    "Library",
    "Material",
    "Rating",
    "Ratings",
    "builtin",
    "coefficients",
    "layers_from_text",
    "material_from_build_up",
    "material_from_values",
    "nrc",
    "saa",
    "text_of_layers",
    "weighted",
]
