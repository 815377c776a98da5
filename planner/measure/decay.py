"""Reverberation times of one microphone position from bursts of interrupted noise.

Bursts, aligned at the switch-off, are averaged as squared pressure (ensemble average, ISO
3382-2:2008, 5.3). Each band then gets the straight-line evaluations of the standard, the
whole-decay fit, the value to use and the reason why.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from planner.errors import RecordingError
from planner.measure.evaluation import evaluate_bands
from planner.measure.figures import BandDecay, DecayCurve, Decays
from planner.measure.filterbank import BandEnergies
from planner.measure.neighbours import with_neighbour_flags

__all__ = ["BandDecay", "DecayCurve", "Decays", "ensemble_average", "evaluate_decays"]


def ensemble_average(bursts: Sequence[BandEnergies]) -> BandEnergies:
    """Average of squared pressure over bursts aligned at the switch-off (`origin`).

    Only the time that all bursts have is kept.

    Raises
    ------
    RecordingError
        Without a burst, or when the bands or frames of two bursts do not match.
    """
    if not bursts:
        raise RecordingError("no usable decay", cure="Record noise that is switched off at once.")
    one = bursts[0]
    if any(abs(other.frame_s - one.frame_s) > 1e-9 or other.bands != one.bands for other in bursts):
        raise RecordingError("two bursts were cut into different frames or bands")
    starts = [round(burst.begin_s / one.frame_s) for burst in bursts]
    begin = max(starts)
    end = min(start + len(burst.energy) for start, burst in zip(starts, bursts, strict=True))
    parts = [
        burst.energy[begin - start : max(end, begin) - start]
        for start, burst in zip(starts, bursts, strict=True)
    ]
    return BandEnergies(
        np.mean(parts, axis=0), one.frame_s, begin * one.frame_s, one.bands, one.reverse
    )


def evaluate_decays(bursts: Sequence[BandEnergies]) -> Decays:
    """Evaluate the bursts of interrupted noise of one position.

    Parameters
    ----------
    bursts
        One per switch-off, frames counted from it (`origin` of `section_energies`): at least
        0.5 s of steady noise before it, the decay and as much of the floor as there is after
        it, ending before the next burst begins. All with the same bands and frames (1 ms).

    Returns
    -------
    decays
        Figures, reasons and curves of every band.

    Raises
    ------
    RecordingError
        Without a burst, when they do not match, or without noise before or silence after.
    """
    mean = ensemble_average(bursts)
    after = len(mean.energy) * mean.frame_s + mean.begin_s
    if mean.begin_s > -0.05 or after < 0.05:
        raise RecordingError(
            f"{max(-mean.begin_s, 0.0):.2f} s of noise before and {max(after, 0.0):.2f} s after "
            f"the switch-off",
            cure="Let the noise run for a second or more and record the silence after it.",
        )
    each = tuple(evaluate_bands(mean, len(bursts)))
    return with_neighbour_flags(Decays(mean.bands, each, len(bursts)))
