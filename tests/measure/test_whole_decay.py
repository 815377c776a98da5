"""The whole-decay fit against the model it stands on: exact input, information bound, two slopes."""

import numpy as np
import pytest

from planner.measure.whole_decay import fit_whole_decay


def falling(time, reverberation_time):
    """60 dB in one reverberation time, by definition."""
    return 10.0 ** (-6.0 * time / reverberation_time)


def cramer_rao(time, reverberation_time, noise, degrees):
    """Least relative standard deviation of T for gamma energies about A·10^(−6t/T) + F.

    A gamma variate with `degrees` independent complex samples has the Fisher information
    `degrees` about the logarithm of its mean; derivatives by finite differences here.
    """

    def log_mean(parameters):
        a, log_t, f = parameters
        return np.log(np.exp(a) * falling(time, np.exp(log_t)) + np.exp(f))

    at = np.array([0.0, np.log(reverberation_time), np.log(noise)])
    step = 1e-5
    slopes = np.array(
        [(log_mean(at + step * e) - log_mean(at - step * e)) / (2 * step) for e in np.eye(3)]
    )
    information = degrees * slopes @ slopes.T
    return float(np.sqrt(np.linalg.inv(information)[1, 1]))


@pytest.mark.parametrize("reverberation_time", [0.15, 0.6, 3.0])
def test_exact_energies_give_the_exact_time_and_floor(reverberation_time):
    time = (np.arange(300) + 0.5) * reverberation_time / 150
    energy = 4.0 * falling(time, reverberation_time) + 4e-5
    fit = fit_whole_decay(energy, time, 1.0)
    assert float(fit.time_s[0]) == pytest.approx(reverberation_time, rel=1e-4)
    assert float(fit.amplitude[0]) == pytest.approx(4.0, rel=1e-4)
    assert float(fit.floor) == pytest.approx(4e-5, rel=1e-4)


def test_two_exact_slopes_come_back():
    time = (np.arange(400) + 0.5) * 0.003
    energy = falling(time, 0.3) + 0.02 * falling(time, 0.9) + 1e-6
    fit = fit_whole_decay(energy, time, 10.0, slopes=2)
    assert fit.time_s == pytest.approx([0.3, 0.9], rel=1e-3)
    assert fit.amplitude == pytest.approx([1.0, 0.02], rel=5e-3)
    assert fit.mean(time) == pytest.approx(energy, rel=1e-3)


def test_scale_and_time_unit_do_not_matter():
    rng = np.random.default_rng(1)
    time = (np.arange(200) + 0.5) * 0.005
    energy = (falling(time, 0.5) + 1e-4)[:, None] * rng.gamma(8.0, 1 / 8.0, (200, 5))
    fit = fit_whole_decay(energy, time, 8.0)
    larger = fit_whole_decay(energy * 1e9, time, 8.0)
    slower = fit_whole_decay(energy, time * 3.0, 8.0)
    assert larger.time_s == pytest.approx(fit.time_s, rel=1e-3)
    assert slower.time_s == pytest.approx(3.0 * fit.time_s, rel=1e-3)


@pytest.mark.parametrize("snr_db", [25.0, 45.0])
@pytest.mark.parametrize("degrees", [0.5, 4.0])
def test_scatter_reaches_the_cramer_rao_bound_and_is_stated(snr_db, degrees):
    """Gamma energies drawn from the model: unbiased, scatter within 1.15 of the bound."""
    rng = np.random.default_rng(2)
    time = (np.arange(150) + 0.5) * 0.01
    noise = 10.0 ** (-snr_db / 10.0)
    mean = falling(time, 0.8) + noise
    energy = mean[:, None] * rng.gamma(degrees, 1.0 / degrees, (150, 400))
    fit = fit_whole_decay(energy, time, degrees)
    relative = fit.time_s[0] / 0.8
    bound = cramer_rao(time, 0.8, noise, degrees)
    assert bound < np.std(relative) * 1.1  # 400 trials know a standard deviation to 3.5 %
    assert np.std(relative) < 1.15 * bound
    assert abs(np.mean(relative) - 1.0) < 2.0 * bound**2 + 2.0 * bound / 20.0
    assert np.median(fit.relative_u) == pytest.approx(bound, rel=0.1)
    inside = np.abs(np.log(relative)) < 1.96 * fit.relative_u[0]
    assert 0.91 < inside.mean() < 0.985


def test_energies_without_any_floor_do_not_upset_the_fit():
    time = (np.arange(200) + 0.5) * 0.005
    fit = fit_whole_decay(falling(time, 0.4), time, 2.0)
    assert float(fit.time_s[0]) == pytest.approx(0.4, rel=1e-3)


def test_nothing_but_noise_says_so_in_its_uncertainty():
    rng = np.random.default_rng(3)
    time = (np.arange(200) + 0.5) * 0.005
    fit = fit_whole_decay(rng.gamma(2.0, 0.5, (200, 20)), time, 2.0)
    assert np.median(fit.relative_u) > 0.3
    assert np.all(np.isfinite(fit.time_s))
