"""Every chart of the app and of the paper; each comes with its message in words and its numbers.

`Chart.vega_lite` gives the ready dictionary for a light or dark page, `Chart.table` the numbers,
`Chart.description` the accessible sentence, `to_svg` a picture without any browser.
"""

from planner.report.band_layers import axis_top
from planner.report.band_series import Series, TargetSteps
from planner.report.band_words import target_sentence
from planner.report.chart import Chart, config, to_svg
from planner.report.charts_bands import (
    absorption,
    formula_range,
    measured_against_predicted,
    reverberation,
)
from planner.report.charts_choice import front, side_by_side
from planner.report.charts_decay import DecayCurve, decay
from planner.report.charts_modes import mode_count, modes
from planner.report.charts_seat import mode_pressure, response
from planner.report.palette import DARK, LIGHT, STYLES, Theme

__all__ = [
    "DARK",
    "LIGHT",
    "STYLES",
    "Chart",
    "DecayCurve",
    "Series",
    "TargetSteps",
    "Theme",
    "absorption",
    "axis_top",
    "config",
    "decay",
    "formula_range",
    "front",
    "measured_against_predicted",
    "mode_count",
    "mode_pressure",
    "modes",
    "response",
    "reverberation",
    "side_by_side",
    "target_sentence",
    "to_svg",
]
