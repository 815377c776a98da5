"""Which assumption of a prediction fails in this room, in words."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES, band_edges
from planner.predict.formulas import Inputs
from planner.predict.reverberation import axis_shares, capped
from planner.room.surfaces import RoomSurfaces

if TYPE_CHECKING:
    from planner.predict.prediction import Prediction

Array = NDArray[np.float64]

HARD, SOFT = 0.10, 0.50
"""One pair of walls under the first while another is over the second makes a flutter likely,
1 to 4 kHz; common practice, no source. [-]"""

PARTED = 1.25
"""From this ratio of Fitzroy's time to Eyring's the formulas are said to part; a judgement. [-]"""

BOOMY, DULL = 1.7, 0.6
"""T₁₂₅ and T₄₀₀₀ against the middle beyond which a room sounds out of balance; a judgement. [-]"""

_MIDDLE = np.array([500 <= hz <= 4000 for hz in OCTAVES])
_HIGH = np.array([1000 <= hz <= 4000 for hz in OCTAVES])


def doubts(prediction: Prediction, surfaces: RoomSurfaces, room: Inputs) -> list[str]:
    """Everything a careful engineer would say beside the numbers."""
    notes = [
        _assumed(prediction),
        _capped(prediction),
        _modal(prediction),
        _uneven(prediction, surfaces, room),
        *_balance(prediction),
        _objects(surfaces),
    ]
    return [note for note in notes if note]


def _assumed(prediction: Prediction) -> str:
    if not prediction.assumed_hz:
        return ""
    bands = ", ".join(str(hz) for hz in prediction.assumed_hz)
    return (
        f"At {bands} Hz some coefficients are assumed: no source gives them. The interval is wide, "
        "and no verdict rests on these bands alone; measure there."
    )


def _capped(prediction: Prediction) -> str:
    if not prediction.capped:
        return ""
    several = prediction.capped > 1
    return (
        f"{prediction.capped} coefficient{'s' if several else ''} above 0.99 "
        f"{'are' if several else 'is'} used as given in Sabine's formula and capped at 0.99 in the "
        "others; above 1 is normal for laboratory values."
    )


def _modal(prediction: Prediction) -> str:
    _, upper = band_edges(OCTAVES)
    modal = [
        str(hz) for hz, edge in zip(OCTAVES, upper, strict=True) if edge < prediction.schroeder_hz
    ]
    if not modal:
        return ""
    return (
        f"Below the Schroeder frequency ({prediction.schroeder_hz:.0f} Hz) a few modes make the "
        f"decay: at {', '.join(modal)} Hz read the time as a decay time and trust a measurement "
        "more than a formula."
    )


def _uneven(prediction: Prediction, surfaces: RoomSurfaces, room: Inputs) -> str:
    """One hard pair of surfaces while the others absorb."""
    areas, means = axis_shares(
        room.area, room.normal, capped(room.alpha), further_area=room.item_area
    )
    high = means[:, _HIGH].mean(axis=1)
    hardest = int(np.argmin(np.where(areas > 0, high, np.inf)))
    pair = _facing(surfaces, hardest)
    flutter = high[hardest] < HARD and high.max() > SOFT
    ratio = 1.0
    if "fitzroy" in prediction.methods and "eyring" in prediction.methods:
        with np.errstate(invalid="ignore"):
            ratios = prediction.methods["fitzroy"] / prediction.methods["eyring"]
        ratio = float(np.nanmax(ratios[_MIDDLE]))
    if not flutter and ratio < PARTED:
        return ""
    note = (
        f"The absorption is spread unevenly: {pair} take only {high[hardest]:.2f} of the sound at "
        f"1 to 4 kHz, the best pair {high.max():.2f}."
    )
    if ratio >= PARTED:
        note += (
            f" Formulas for a diffuse field then read short; Fitzroy gives up to {ratio:.1f} times "
            "Eyring's time."
        )
    if flutter:
        note += f" Expect a flutter echo between {pair}: treat one of them."
    return note


def _facing(surfaces: RoomSurfaces, axis: int) -> str:
    """The surfaces that face along an axis, in words."""
    names = dict.fromkeys(
        part.on for part in surfaces.parts if part.kind == "base" and part.normal[axis] ** 2 > 0.5
    )
    return " and ".join(names) or f"the surfaces across axis {'xyz'[axis]}"


def _balance(prediction: Prediction) -> list[str]:
    if not np.all(np.isfinite(prediction.time)):
        return []
    balance = prediction.balance
    notes = []
    if balance["bass"] > BOOMY:
        notes.append(
            f"The bass rings long: the time at 125 Hz is {balance['bass']:.1f} times that of the "
            "middle. Only depth or resonance absorbs there; thin panels would make it worse."
        )
    if balance["treble"] < DULL:
        notes.append(
            f"The treble is dry: the time at 4 kHz is {balance['treble']:.1f} times that of the "
            "middle. More porous absorption would make the room dull."
        )
    return notes


def _objects(surfaces: RoomSurfaces) -> str:
    share = surfaces.object_volume / surfaces.volume
    if share <= 0.2:
        return ""
    return (
        f"Hard objects fill {share:.0%} of the room; EN 12354-6 is meant for less (from memory: up "
        "to 20 %)."
    )
