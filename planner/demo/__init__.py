"""An invented project: a room, a catalogue with invented prices, and synthesised recordings.

Enters: an empty folder. Leaves: the project in it, and every command of the loop with its result.
"""

from planner.demo.run import DemoResult, run_demo
from planner.demo.write import write_project

__all__ = ["DemoResult", "run_demo", "write_project"]
