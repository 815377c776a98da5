"""What one band does to the next: a long decay leaks through the skirt of a filter."""

from __future__ import annotations

from dataclasses import replace

from planner.measure.figures import Decays

LEAK_RATIO = 1.8
"""A band whose lower neighbour rings this many times longer is in doubt (common practice). [-]"""


def with_neighbour_flags(decays: Decays) -> Decays:
    """Flag ``neighbour-leak`` where the lower neighbour rings more than 1.8 times longer."""
    each = list(decays.each)
    for index in range(1, len(each)):
        if each[index - 1].t_s > LEAK_RATIO * each[index].t_s:
            each[index] = replace(each[index], flags=(*each[index].flags, "neighbour-leak"))
    return replace(decays, each=tuple(each))
