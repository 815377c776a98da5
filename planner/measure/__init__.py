"""What a room does sound like: recordings enter, reverberation times with uncertainty leave.

The test signal to play on site is made here too.
"""

from planner.measure.measured import Measured, read_measured, write_measured
from planner.measure.measurement import Measurement, measure
from planner.measure.noise import cue_sheet, noise_signal, write_signal

__all__ = [
    "Measured",
    "Measurement",
    "cue_sheet",
    "measure",
    "noise_signal",
    "read_measured",
    "write_measured",
    "write_signal",
]
