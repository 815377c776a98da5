"""What a room should sound like: surfaces enter, times, modes, responses and reflections leave.

Formulas see arrays; `predict` joins them to a room.
"""

from planner.predict.prediction import Prediction, predict
from planner.predict.targets import USES, TargetLimits, own_limits, target_limits, target_of

__all__ = [
    "USES",
    "Prediction",
    "TargetLimits",
    "own_limits",
    "predict",
    "target_limits",
    "target_of",
]
