"""Words that the comparison, the calibration and the proof share."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import ArrayLike

from planner.bands import band_label


def listed_bands(bands: Iterable[float]) -> str:
    """``125, 250, 1k Hz``."""
    return ", ".join(band_label(hz) for hz in bands) + " Hz"


def and_list(words: Iterable[str]) -> str:
    """``a, b and c``."""
    items = list(words)
    return items[0] if len(items) == 1 else f"{', '.join(items[:-1])} and {items[-1]}"


def json_list(values: ArrayLike) -> list[float | None]:
    """Numbers over bands for JSON: None where there is none."""
    return [float(value) if np.isfinite(value) else None for value in np.asarray(values, float)]
