"""The boxed normal distribution, against rejection sampling, closed forms and a solver."""

import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.stats import truncnorm

from planner.reconcile.posterior import BoxedNormal


def boxed(mean, covariance, lower, upper):
    return BoxedNormal(*(np.asarray(value, float) for value in (mean, covariance, lower, upper)))


@pytest.mark.parametrize(
    ("mean", "low", "high"), [(0.0, -9, 9), (0.1, 0, 1.3), (-3.0, 0, 1), (8.0, 0, 1)]
)
def test_one_dimension_is_scipys_cut_normal(mean, low, high):
    """Mean and standard deviation of 20 000 draws, within 4 of their standard errors."""
    reference = truncnorm(low - mean, high - mean, loc=mean, scale=1.0)
    draws = boxed([mean], [[1.0]], [low], [high]).draws(20_000, seed=1)[:, 0]
    assert draws.min() >= low
    assert draws.max() <= high
    assert draws.mean() == pytest.approx(
        reference.mean(), abs=4 * reference.std() / np.sqrt(20_000)
    )
    assert draws.std() == pytest.approx(reference.std(), rel=0.04)


def test_a_correlated_corner_agrees_with_rejection_sampling():
    """Three unknowns whose sum is well known, two of them near zero: draws kept from numpy's own."""
    covariance = np.array([[1.0, -0.8, 0.1], [-0.8, 1.0, -0.2], [0.1, -0.2, 0.5]])
    mean, lower, upper = np.array([0.3, -0.1, 0.2]), np.zeros(3), np.array([2.0, 2.0, 0.7])
    plain = np.random.default_rng(5).multivariate_normal(mean, covariance, size=400_000)
    kept = plain[np.all((plain > lower) & (plain < upper), axis=1)]
    draws = boxed(mean, covariance, lower, upper).draws(20_000, seed=2)
    assert len(kept) > 10_000
    assert draws.mean(axis=0) == pytest.approx(kept.mean(axis=0), abs=0.02)
    assert np.cov(draws.T) == pytest.approx(np.cov(kept.T), abs=0.02)


def test_draws_repeat_with_their_seed_and_change_with_it():
    one = boxed([0.1, 0.2], [[0.04, 0.01], [0.01, 0.04]], [0, 0], [1, 1])
    assert np.array_equal(one.draws(50, seed=3), one.draws(50, seed=3))
    assert not np.array_equal(one.draws(50, seed=3), one.draws(50, seed=4))


@pytest.mark.parametrize("seed", range(8))
def test_the_most_likely_point_is_what_a_general_minimiser_finds(seed):
    random = np.random.default_rng(seed)
    root = random.standard_normal((5, 5))
    covariance = root @ root.T + 0.1 * np.eye(5)
    one = boxed(random.normal(0, 1, 5), covariance, np.zeros(5), np.full(5, 1.3))
    precision = np.linalg.inv(covariance)
    found = minimize(
        lambda x: (x - one.mean) @ precision @ (x - one.mean),
        np.full(5, 0.5),
        bounds=[(0, 1.3)] * 5,
        method="L-BFGS-B",
        options={"ftol": 1e-15, "gtol": 1e-10},
    )
    assert one.most_likely() == pytest.approx(found.x, abs=1e-4)


def test_observing_a_sum_by_hand():
    """Two unknowns 0 ± 1; their sum is seen as 1 ± 1: each becomes 1/3, variance 2/3, covariance −1/3."""
    after = boxed([0, 0], np.eye(2), [-9, -9], [9, 9]).updated(
        np.array([[1.0, 1.0]]), np.array([1.0]), np.array([1.0])
    )
    assert after.mean == pytest.approx([1 / 3, 1 / 3])
    assert after.covariance == pytest.approx(np.array([[2, -1], [-1, 2]]) / 3)
