"""Whole-decay fit: maximum likelihood of an exponential decay above a constant noise floor.

The frame energies of band-limited noise are gamma distributed about their mean, with twice
(statistical bandwidth × frame × number of decays) degrees of freedom. Fitting the mean

    μ(t) = A·10^(−6 t/T) + F        or        A₁·10^(−6 t/T₁) + A₂·10^(−6 t/T₂) + F

by that likelihood uses every frame with the weight it deserves: nothing has to be cut off above
the floor, and none of the bias of a line through fluctuating levels enters.
All functions take many decays at once: frame is the first axis, whatever follows is kept.

References
----------
.. [1] R. A. Fisher, "On the mathematical foundations of theoretical statistics", Phil. Trans. R.
   Soc. A 222 (1922): maximum likelihood and its information.
.. [2] J. S. Bendat, A. G. Piersol, *Random Data*, 4th ed., Wiley 2010, section 8.3: degrees of
   freedom of the mean square of band-limited noise, from the statistical bandwidth
   B_s = (∫|H|²)²/∫|H|⁴.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

DECAY_CONSTANT = 6.0 * np.log(10.0)
"""Energy falls by this many nepers in one reverberation time. [-]"""


@dataclass(frozen=True, slots=True)
class WholeDecay:
    """Maximum-likelihood fit of one or two exponentials and a floor; one entry per decay."""

    time_s: Array
    """Reverberation times, shape ``(slope, ...)``, shorter first. [s]"""
    amplitude: Array
    """Energy of each exponential at t = 0, shape ``(slope, ...)``. [as the energies]"""
    floor: Array
    """Noise floor, shape ``(...)``. [as the energies]"""
    relative_u: Array
    """Relative standard uncertainty of each time, shape ``(slope, ...)``. [-]"""
    deviance: Array
    """Twice the log-likelihood missing to a perfect fit, shape ``(...)``. [-]"""

    def decay(self, index: int) -> WholeDecay:
        """One of many decays, its fields without the last axis."""
        return WholeDecay(
            self.time_s[..., index],
            self.amplitude[..., index],
            self.floor[..., index],
            self.relative_u[..., index],
            self.deviance[..., index],
        )

    def mean(self, time: ArrayLike) -> Array:
        """The fitted energy at `time` [s], shape ``(time, ...)``."""
        t = np.asarray(time, float).reshape(-1, *(1,) * self.floor.ndim)
        total: Array = self.floor + sum(
            a * np.exp(-DECAY_CONSTANT * t / tau)
            for a, tau in zip(self.amplitude, self.time_s, strict=True)
        )
        return total


def fit_whole_decay(
    energy: Array,
    times: Array,
    degrees: ArrayLike,
    *,
    slopes: int = 1,
    single: WholeDecay | None = None,
) -> WholeDecay:
    """Fit one or two exponentials and a floor to frame energies.

    Parameters
    ----------
    energy
        Mean squared pressure of the frames, shape ``(frame, ...)``.
    times
        Middle of each frame after the switch-off, shape ``(frame,)``. [s]
    degrees
        Independent complex samples in a frame (half its degrees of freedom), shape ``(...)``. [-]
    slopes
        1 or 2 exponentials.
    single
        The fit of one exponential to the same energies, from which that of two begins; it is made
        where not given.

    Returns
    -------
    fit
        With the uncertainty from the Fisher information.
    """
    shape = energy.shape[1:]
    data = energy.reshape(len(energy), -1)
    weight = np.broadcast_to(np.asarray(degrees, float), shape).reshape(-1)
    scale = np.maximum(data.mean(axis=0), 1e-300)
    data = np.maximum(data / scale, 1e-20)
    if single is None:
        theta = _start_one(data, times)
        if slopes == 2:
            theta, _, _ = _maximise(data, times, weight, theta)
    else:
        theta = np.log(
            np.maximum([single.amplitude[0] / scale, single.time_s[0], single.floor / scale], 1e-30)
        ).reshape(3, -1)
    if slopes == 2:
        theta = _start_two(data, times, weight, theta)
    theta, deviance, information = _maximise(data, times, weight, theta)
    covariance = np.linalg.pinv(np.moveaxis(information, -1, 0), hermitian=True)
    order = np.argsort(theta[1:-1:2], axis=0)
    taken = np.take_along_axis
    variance = np.diagonal(covariance, axis1=1, axis2=2).T[1:-1:2]
    return WholeDecay(
        time_s=np.exp(taken(theta[1:-1:2], order, 0)).reshape(slopes, *shape),
        amplitude=(np.exp(taken(theta[0:-1:2], order, 0)) * scale).reshape(slopes, *shape),
        floor=(np.exp(theta[-1]) * scale).reshape(shape),
        relative_u=np.sqrt(np.maximum(taken(variance, order, 0), 0)).reshape(slopes, *shape),
        deviance=deviance.reshape(shape),
    )


def _terms(theta: Array, times: Array) -> tuple[Array, Array]:
    """Mean μ, shape (frame, decay), and d ln μ/dθ, shape (parameter, frame, decay)."""
    t = times[:, None]
    parts = [
        np.exp(theta[i] - DECAY_CONSTANT * t * np.exp(-theta[i + 1]))
        for i in range(0, len(theta) - 1, 2)
    ]
    floor = np.exp(theta[-1])
    mean = sum(parts) + floor
    slopes = np.empty((len(theta), *mean.shape))
    for i, part in enumerate(parts):
        slopes[2 * i] = part / mean
        slopes[2 * i + 1] = slopes[2 * i] * (DECAY_CONSTANT * t * np.exp(-theta[2 * i + 1]))
    slopes[-1] = floor / mean
    return mean, slopes


def _deviance(data: Array, mean: Array, weight: Array) -> Array:
    ratio = data / mean
    total: Array = 2.0 * weight * np.sum(ratio - np.log(ratio) - 1.0, axis=0)
    return total


def _maximise(
    data: Array, times: Array, weight: Array, theta: Array, rounds: int = 60
) -> tuple[Array, Array, Array]:
    """Fisher scoring with a damping of its own for every decay."""
    count = len(theta)
    damping = np.full(data.shape[1], 1e-3)
    mean, slopes = _terms(theta, times)
    deviance = _deviance(data, mean, weight)
    information = _information(slopes, weight)
    active = np.ones(data.shape[1], bool)
    for _ in range(rounds):
        a = np.flatnonzero(active)
        score = np.einsum("ptd,td->pd", slopes[..., a], data[:, a] / mean[:, a] - 1.0) * weight[a]
        system = np.moveaxis(information[..., a], -1, 0).copy()
        diagonal = np.arange(count)
        system[:, diagonal, diagonal] *= 1.0 + damping[a][:, None]
        system[:, diagonal, diagonal] += 1e-9 * weight[a][:, None]
        step = np.linalg.solve(system, score.T[..., None])[..., 0].T
        trial = theta[:, a] + np.clip(step, -1.0, 1.0)
        new_mean, new_slopes = _terms(trial, times)
        new_deviance = _deviance(data[:, a], new_mean, weight[a])
        better = new_deviance <= deviance[a]
        gain = deviance[a] - new_deviance
        b = a[better]
        theta[:, b], deviance[b] = trial[:, better], new_deviance[better]
        mean[:, b], slopes[..., b] = new_mean[:, better], new_slopes[..., better]
        information[..., b] = _information(slopes[..., b], weight[b])
        damping[a] = np.where(better, damping[a] * 0.2, damping[a] * 8.0)
        small = np.max(np.abs(step), axis=0) < 1e-4
        active[a[(better & (gain < 1e-6) & small) | (damping[a] > 1e8)]] = False
        if not active.any():
            break
    return theta, deviance, information


def _information(slopes: Array, weight: Array) -> Array:
    """Fisher information, shape (parameter, parameter, decay)."""
    information: Array = np.einsum("ptd,qtd->pqd", slopes, slopes) * weight
    return information


def _start_one(data: Array, times: Array) -> Array:
    """The best of a grid of times, with the amplitude and floor that suit each."""
    frames = len(times)
    floor = np.maximum(np.median(data[-max(frames // 5, 3) :], axis=0), 1e-10)
    spacing = float(times[1] - times[0])
    grid = np.geomspace(max(4.0 * spacing, 0.02), 4.0 * float(times[-1]), 28)
    best = np.full(data.shape[1], np.inf)
    theta = np.zeros((3, data.shape[1]))
    above = np.maximum(data - floor, 0.0)
    for tau in grid:
        shape = np.exp(-DECAY_CONSTANT * times / tau)
        amplitude = np.maximum(shape @ above / (shape @ shape), 1e-9)
        mean = amplitude * shape[:, None] + floor
        deviance = _deviance(data, mean, np.ones(data.shape[1]))
        better = deviance < best
        best = np.where(better, deviance, best)
        theta[0] = np.where(better, np.log(amplitude), theta[0])
        theta[1] = np.where(better, np.log(tau), theta[1])
    theta[2] = np.log(floor)
    return theta


STARTS = ((0.6, 1.6, 2.0), (0.7, 2.5, 5.0), (0.8, 1.2, 1.0), (0.2, 1.02, 0.5))
"""Where two slopes are looked for: both times over the single one, and how many nepers the flatter
one begins under the steeper. [-]"""


def _start_two(data: Array, times: Array, weight: Array, one: Array) -> Array:
    """From the single slope: a steeper part on top and a flatter one under it, the best of some."""
    trials = [
        np.stack([one[0], one[1] + np.log(steep), one[0] - drop, one[1] + np.log(flat), one[2]])
        for steep, flat, drop in STARTS
    ]
    many = len(STARTS)
    theta, deviance, _ = _maximise(
        np.tile(data, many), times, np.tile(weight, many), np.concatenate(trials, axis=1), rounds=12
    )
    best = np.argmin(deviance.reshape(many, -1), axis=0)
    chosen: Array = theta.reshape(5, many, -1)[:, best, np.arange(data.shape[1])]
    return chosen
