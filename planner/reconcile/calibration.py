"""What a calibration found: coefficients that fit, what is still not known, and draws from it."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.bands import OCTAVES
from planner.predict.reverberation import LARGEST_ALPHA
from planner.reconcile.forward import Shell
from planner.reconcile.posterior import BoxedNormal
from planner.reconcile.prior import BANDS, Unknown, item_groups
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

TOLD_APART = 0.5
"""Share of a coefficient's variance that the measurement must take away. [-]"""

SPREAD_DRAWS = 600
"""Draws behind the uncertainty of the coefficients that are handed on."""

CONFUSED = -0.4
"""Correlation below which two materials are called not told apart. [-]"""


@dataclass(frozen=True, slots=True)
class Draws:
    """Seeded joint draws of everything that absorbs."""

    alpha: Array
    """Shape ``(draw, part, band)``. [-]"""
    item_area: Array
    """Of one piece, shape ``(draw, item, band)``, in the order of the room's furnishings. [m²]"""


@dataclass(frozen=True)
class Calibration:
    """Coefficients that fit a measurement, and how well they are known."""

    formula: str
    """``sabine`` or ``eyring``: the coefficients are right in this formula."""
    described: RoomSurfaces
    """The room before the calibration."""
    shell: Shell
    unknowns: tuple[Unknown, ...]
    """Materials, furnishings and, last, the unexplained rest."""
    posterior: BoxedNormal
    """Over ``unknown × band``, band fastest."""
    value: Array
    """Best fit, shape ``(unknown, band)``: coefficient [-] or area of a piece [m²]."""
    u: Array
    """Its standard uncertainty, shape ``(unknown, band)``."""
    interval: Array
    """95 % interval, shape ``(2, unknown, band)``."""
    reduction: Array
    """Share of the prior variance that the measurement took away, ``(unknown, band)``. [-]"""
    measured: Array
    """Measured reverberation time, shape ``(band,)``; NaN where there is none. [s]"""
    measured_u: Array
    """With the formula's own uncertainty, shape ``(band,)``. [s]"""
    predicted: Array
    """As described, shape ``(band,)``. [s]"""
    fitted: Array
    """With the coefficients of the best fit, shape ``(band,)``. [s]"""
    warnings: tuple[str, ...]

    @property
    def names(self) -> tuple[str, ...]:
        """Of the unknowns."""
        return tuple(row.name for row in self.unknowns)

    @property
    def measured_hz(self) -> tuple[int, ...]:
        """Bands with a measurement. [Hz]."""
        return tuple(hz for hz, t in zip(OCTAVES, self.measured, strict=True) if np.isfinite(t))

    @property
    def told_apart(self) -> NDArray[np.bool_]:
        """Where the measurement says something about one unknown alone, ``(unknown, band)``."""
        return self.reduction >= TOLD_APART

    @property
    def correlation(self) -> Array:
        """Between unknowns in the same band, shape ``(band, unknown, unknown)``. [-]."""
        cube = self.posterior.covariance.reshape(len(self.unknowns), BANDS, -1, BANDS)
        same = np.einsum("ibjb->bij", cube)
        scale = np.sqrt(np.maximum(np.einsum("bii->bi", same), 1e-18))
        result: Array = same / (scale[:, :, None] * scale[:, None, :])
        return result

    @property
    def unexplained(self) -> Array:
        """Absorption area that no listed surface or furnishing explains, ``(band,)``. [m²]."""
        rest: Array = self.value[-1]
        return rest

    @cached_property
    def surfaces(self) -> RoomSurfaces:
        """The room with the coefficients that fit: what prediction and treatment begin with.

        What stayed unexplained is spread over the surfaces in proportion to what they absorb, so
        that the room's total is what was measured. A band that was measured is no longer assumed:
        the measurement, not a guess, now says how much is absorbed there.
        """
        room, items = self.described, self._item_index
        unmeasured = ~np.isfinite(self.measured)
        return replace(
            room,
            alpha=self._spread_rest(self.value[self._part_index], self.unexplained),
            u=self.joint_draws(SPREAD_DRAWS, seed=0).alpha.std(axis=0, ddof=1),
            assumed=room.assumed & unmeasured,
            item_area=self.value[items].reshape(-1, BANDS),
            item_u=self.u[items].reshape(-1, BANDS),
            item_assumed=room.item_assumed & unmeasured,
        )

    @property
    def _part_index(self) -> NDArray[np.intp]:
        """Unknown of each part: materials come first, in the order of `RoomSurfaces.materials`."""
        return self.described.material_index

    @property
    def _item_index(self) -> NDArray[np.intp]:
        """Unknown of each furnishing."""
        index = np.zeros(len(self.described.items), dtype=np.intp)
        for number, group in enumerate(item_groups(self.described), len(self.described.materials)):
            index[group] = number
        return index

    def _spread_rest(self, alpha: Array, rest: Array) -> Array:
        """Coefficients ``(..., part, band)`` with the rest ``(..., band)`` spread over them."""
        grows = alpha < LARGEST_ALPHA
        total = np.einsum("p,...pb->...b", self.described.area, np.where(grows, alpha, 0.0))
        factor = np.maximum(1.0 + rest / np.maximum(total, 1e-9), 0.0)
        spread: Array = np.where(grows, alpha * factor[..., None, :], alpha)
        return spread

    def joint_draws(self, count: int, seed: int) -> Draws:
        """Coefficients and furnishings drawn together: their correlations are kept.

        As in `surfaces`, what is unexplained in a draw is spread over its coefficients.
        """
        values = self.posterior.draws(count, seed).reshape(count, len(self.unknowns), BANDS)
        alpha = self._spread_rest(values[:, self._part_index], values[:, -1])
        return Draws(alpha, values[:, self._item_index])

    def draws(self, count: int, seed: int) -> Array:
        """Coefficients of every part, shape ``(draw, part, band)``; see `joint_draws`. [-]."""
        return self.joint_draws(count, seed).alpha

    @cached_property
    def words(self) -> tuple[str, ...]:
        """What was found, in sentences: the assumptions most likely wrong first."""
        from planner.reconcile.findings import findings

        return findings(self)

    def to_json(self) -> dict[str, Any]:
        """The part of ``planner compare --json`` about coefficients."""
        from planner.reconcile.findings import calibration_json

        return calibration_json(self)
