"""Where prediction and measurement differ, and why: enter a `Prediction` and a `Measured`.

Leave the comparison band by band, the coefficients that fit what was measured (with what is still
not known about them), and the proof of what a treatment did.
"""

from planner.reconcile.calibrate import calibrate, calibrate_room
from planner.reconcile.calibration import Calibration
from planner.reconcile.compare import Comparison, compare, compare_room
from planner.reconcile.proof import Proof, prove, prove_room

__all__ = [
    "Calibration",
    "Comparison",
    "Proof",
    "calibrate",
    "calibrate_room",
    "compare",
    "compare_room",
    "prove",
    "prove_room",
]
