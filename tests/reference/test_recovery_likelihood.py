"""The likelihood's one pass against a general Gaussian-process library and dense algebra."""

import celerite2
import numpy as np
import pytest
from scipy.stats import multivariate_normal

from planner.recovery import drw_log_likelihood


def light_curve(seed, n, span):
    rng = np.random.default_rng(seed)
    t = np.sort(rng.uniform(0.0, span, n))
    return t, rng.normal(1.0, 0.3, n), rng.uniform(0.01, 0.2, n)


def covariance(t, err, sigma, tau):
    return sigma**2 * np.exp(-np.abs(t[:, None] - t) / tau) + np.diag(err**2)


@pytest.mark.parametrize("sigma", [0.05, 0.4])
@pytest.mark.parametrize("tau", [0.5, 40.0, 3000.0])
@pytest.mark.parametrize(("n", "span"), [(1, 1.0), (157, 180.0), (1500, 2000.0)])
def test_agrees_with_celerite2(n, span, tau, sigma):
    t, y, err = light_curve(n, n, span)
    process = celerite2.GaussianProcess(
        celerite2.terms.RealTerm(a=sigma**2, c=1 / tau), mean=0.9, t=t, yerr=err
    )
    expected = process.log_likelihood(y)
    assert drw_log_likelihood(t, y, err, sigma, tau, mean=0.9) == pytest.approx(expected, rel=1e-8)


@pytest.mark.parametrize("tau", [0.5, 40.0, 3000.0])
def test_agrees_with_the_dense_gaussian(tau):
    t, y, err = light_curve(3, 60, 100.0)
    t[10:13] = t[10]
    expected = multivariate_normal(np.zeros(t.size), covariance(t, err, 0.3, tau)).logpdf(y)
    mixed = np.random.default_rng(0).permutation(t.size)
    found = drw_log_likelihood(t[mixed], y[mixed], err[mixed], 0.3, tau)
    assert found == pytest.approx(expected, rel=1e-9)


def test_free_mean_is_the_integral_over_all_means():
    t, y, err = light_curve(4, 30, 60.0)
    means = np.linspace(-3.0, 5.0, 4001)
    fixed = np.array([drw_log_likelihood(t, y, err, 0.3, 20.0, mean=m) for m in means])
    expected = np.log(np.trapezoid(np.exp(fixed), means))
    assert drw_log_likelihood(t, y, err, 0.3, 20.0, mean=None) == pytest.approx(expected, rel=1e-9)


def test_noiseless_points_are_allowed_but_not_twice_at_one_time():
    t, y = np.array([0.0, 3.0, 10.0]), np.array([0.1, 0.2, -0.1])
    expected = multivariate_normal(np.zeros(3), covariance(t, np.zeros(3), 0.3, 5.0)).logpdf(y)
    assert drw_log_likelihood(t, y, 0.0, 0.3, 5.0) == pytest.approx(expected, rel=1e-9)
    assert drw_log_likelihood([0.0, 3.0, 3.0], y, 0.0, 0.3, 5.0) == -np.inf


@pytest.mark.parametrize(("sigma", "tau"), [(0.0, 5.0), (1.0, -5.0), (np.nan, 5.0)])
def test_impossible_walk_is_refused(sigma, tau):
    with pytest.raises(ValueError, match="need sigma > 0 and tau_d > 0"):
        drw_log_likelihood([0.0, 1.0], [0.0, 1.0], 0.1, sigma, tau)
