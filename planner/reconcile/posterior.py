"""A normal distribution inside a box: its most likely point and seeded draws from it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SWEEPS = 8
"""Passes of the sampler over all directions before a draw is taken."""


@dataclass(frozen=True, slots=True)
class BoxedNormal:
    """N(mean, covariance), cut off at `lower` and `upper`."""

    mean: Array
    """Of the uncut distribution, shape ``(unknown,)``."""
    covariance: Array
    """Of the uncut distribution, shape ``(unknown, unknown)``."""
    lower: Array
    """Shape ``(unknown,)``."""
    upper: Array
    """Shape ``(unknown,)``."""

    def updated(self, design: Array, observed: Array, observed_u: Array) -> BoxedNormal:
        """The distribution after observing ``design @ x``.

        Parameters
        ----------
        design
            Shape ``(observation, unknown)``.
        observed, observed_u
            Values and their standard uncertainties, shape ``(observation,)``.

        Notes
        -----
        The update of a linear model with normal errors; the box stays, because a cut prior times a
        normal likelihood is the cut product.
        """
        spread = self.covariance @ design.T
        total = design @ spread + np.diag(observed_u**2)
        gain = np.linalg.solve(total, spread.T).T
        covariance = self.covariance - gain @ spread.T
        mean = self.mean + gain @ (observed - design @ self.mean)
        return BoxedNormal(mean, 0.5 * (covariance + covariance.T), self.lower, self.upper)

    @property
    def factor(self) -> Array:
        """Lower triangle L with covariance L Lᵀ; a little is added where that is singular."""
        scale = np.sqrt(np.maximum(np.diag(self.covariance), 1e-18))
        correlation = self.covariance / np.outer(scale, scale)
        lower: Array = np.linalg.cholesky(correlation + 1e-9 * np.eye(scale.size))
        return scale[:, None] * lower

    def most_likely(self) -> Array:
        """The point of highest density in the box, by bounded least squares, ``(unknown,)``."""
        if np.all((self.mean > self.lower) & (self.mean < self.upper)):
            return self.mean.copy()
        from scipy.linalg import solve_triangular
        from scipy.optimize import lsq_linear

        factor = self.factor
        whiten = solve_triangular(factor, np.eye(self.mean.size), lower=True)
        result = lsq_linear(
            whiten, whiten @ self.mean, bounds=(self.lower, self.upper), method="bvls", tol=1e-10
        )
        inside: Array = np.clip(result.x, self.lower, self.upper)
        return inside

    def draws(self, count: int, seed: int, *, sweeps: int = SWEEPS) -> Array:
        """Seeded draws, shape ``(count, unknown)``, all inside the box.

        Notes
        -----
        Each draw is the end of a chain of its own that starts at the most likely point and moves
        along the columns of the covariance's factor, each time by an exact draw from the normal
        distribution cut where the line leaves the box. Where no bound is near, one pass gives
        independent exact draws; the further passes serve the corners.
        """
        random = np.random.default_rng(seed)
        factor = self.factor
        start = np.clip(self.most_likely(), self.lower, self.upper)
        # Coordinates along the columns: point = mean + factor @ along; one chain per column.
        point = np.repeat(start[:, None], count, axis=1)
        along = np.repeat(np.linalg.solve(factor, start - self.mean)[:, None], count, axis=1)
        lower, upper = self.lower[:, None], self.upper[:, None]
        columns = [np.flatnonzero(np.abs(column) > 1e-12) for column in factor.T]
        for _ in range(sweeps):
            for k, rows in enumerate(columns):
                step, here = factor[rows, k][:, None], point[rows]
                one, other = (lower[rows] - here) / step, (upper[rows] - here) / step
                least = np.minimum(np.minimum(one, other).max(axis=0), 0.0) + along[k]
                most = np.maximum(np.maximum(one, other).min(axis=0), 0.0) + along[k]
                new = np.clip(_cut_normal(least, most, random.random(count)), least, most)
                point[rows] += (new - along[k]) * step
                along[k] = new
        return np.clip(point.T, self.lower, self.upper)


def _cut_normal(least: Array, most: Array, share: Array) -> Array:
    """Standard normal values between two limits, at a share of the probability there."""
    from scipy.special import ndtr, ndtri

    # The tail on the left is where the distribution function is exact.
    left = least <= 0
    low = ndtr(np.where(left, least, -most))
    high = ndtr(np.where(left, most, -least))
    value = ndtri(np.clip(low + (high - low) * share, 1e-300, 1 - 1e-16))
    drawn: Array = np.where(left, value, -value)
    return drawn
