"""The room treatment planner: predict, measure and treat the reverberation of small rooms.

A room walks through the folders of this package in order: ``absorption`` (what surfaces take),
``room`` (what the room is), ``predict`` (what it should sound like), ``measure`` (what it does
sound like), ``reconcile`` (where the two differ), ``treat`` (what to do about it), ``report``
(how it is shown); ``app`` and ``cli`` call them.
"""

from importlib.metadata import PackageNotFoundError, version

try:
    __version__ = version("room-treatment-planner")
except PackageNotFoundError:  # run from a checkout that was never installed
    __version__ = "0+unknown"

__all__ = ["__version__"]
