"""Where prediction and measurement differ, and why: enter a `Prediction` and a `Measured`.

Leave the comparison band by band, the coefficients that fit what was measured (with what is still
not known about them), and the proof of what a treatment did.
"""

from planner.reconcile.compare import Comparison, compare, compare_room

__all__ = ["Comparison", "compare", "compare_room"]
