"""The joint likelihood against dense Gaussians and a general Gaussian-process library."""

import celerite2
import numpy as np
import pytest
from scipy.stats import multivariate_normal

from planner.recovery.joint import continuum_factor, joint_log_likelihood, line_given, make_pair
from planner.recovery.response import Response, cross_covariance, line_covariance


def light_curves(seed, n, m, span=120.0):
    rng = np.random.default_rng(seed)
    t1, t2 = rng.uniform(0, span, n), rng.uniform(0, span, m)
    f1, f2 = rng.normal(1, 0.2, n), rng.normal(5, 0.2, m)
    return t1, f1, rng.uniform(0.01, 0.1, n), t2, f2, rng.uniform(0.02, 0.1, m)


def dense_top_hat(d, w, tau):
    """Plain closed forms in extended precision: covariances with and of a top hat."""
    d, w, tau = np.abs(d).astype(np.longdouble), np.longdouble(w), np.longdouble(tau)
    inside = tau / w * (2 - np.exp(-(w / 2 + d) / tau) - np.exp((d - w / 2) / tau))
    outside = np.exp(-d / tau) * np.sinh(w / 2 / tau) * 2 * tau / w
    cross = np.where(d < w / 2, inside, outside)
    ramp = lambda x: tau**2 * np.exp(-np.abs(x) / tau) + tau * np.abs(x)  # noqa: E731
    own = (ramp(d + w) - 2 * ramp(d) + ramp(d - w)) / w**2
    return cross.astype(float), own.astype(float)


def integrated(y, covariance, columns):
    """Log density with the columns' coefficients integrated out under flat priors."""
    inverse = np.linalg.inv(covariance)
    gram = columns.T @ inverse @ columns
    best = np.linalg.solve(gram, columns.T @ inverse @ y)
    at_best = multivariate_normal(np.zeros(y.size), covariance).logpdf(y - columns @ best)
    return at_best + 0.5 * (best.size * np.log(2 * np.pi) - np.linalg.slogdet(gram)[1])


def dense(curves, labels, lag, sigma, tau, scale, w):
    t1, f1, e1, t2, f2, e2 = curves
    n, variance = t1.size, sigma**2
    own = variance * np.exp(-np.abs(t1[:, None] - t1) / tau) + np.diag(e1**2)
    cross = scale * variance * dense_top_hat(t2 - lag - t1[:, None], w, tau)[0]
    line = scale**2 * variance * dense_top_hat(t2[:, None] - t2, w, tau)[1] + np.diag(e2**2)
    kinds = np.unique(labels)
    columns = np.zeros((n + t2.size, kinds.size + 1))
    columns[:n, :-1], columns[n:, -1] = labels[:, None] == kinds, 1.0
    both = np.block([[own, cross], [cross.T, line]])
    return integrated(np.concatenate([f1, f2]), both, columns)


@pytest.mark.parametrize("telescopes", [1, 3])
@pytest.mark.parametrize("tau", [5.0, 60.0, 2000.0])
def test_agrees_with_the_dense_gaussian(tau, telescopes):
    curves = light_curves(1, 30, 12)
    labels = np.random.default_rng(2).integers(0, telescopes, 30)
    pair = make_pair(*curves, labels)
    lags = np.array([-8.0, 3.0, 17.0, 44.0])
    found = joint_log_likelihood(pair, lags, 0.3, tau, 0.7, Response("top_hat", 0.6))
    expected = [dense(curves, labels, lag, 0.3, tau, 0.7, 0.6 * abs(lag)) for lag in lags]
    assert found == pytest.approx(np.array(expected), rel=1e-8)


@pytest.mark.slow
def test_agrees_with_the_dense_gaussian_at_full_size():
    curves = light_curves(3, 120, 40)
    lags = np.linspace(2.0, 90.0, 23)
    found = joint_log_likelihood(make_pair(*curves), lags, 0.3, 60.0, 0.7, Response("top_hat", 0.6))
    zeros = np.zeros(120)
    expected = [dense(curves, zeros, lag, 0.3, 60.0, 0.7, 0.6 * lag) for lag in lags]
    assert found == pytest.approx(np.array(expected), rel=1e-8, abs=1e-8)


@pytest.mark.parametrize("response", [Response("gaussian", 0.3), Response("ring", 0.8)], ids=str)
def test_other_shapes_go_the_same_way(response):
    t1, f1, e1, t2, f2, e2 = light_curves(4, 20, 7)
    t1, t2 = np.sort(t1), np.sort(t2)
    own = np.exp(-np.abs(t1[:, None] - t1) / 40)
    cross = cross_covariance(t1, t2, [12.0], 40.0, response)[0]
    line = line_covariance(t2, [12.0], 40.0, response)[0]
    both = 0.09 * np.block([[own, 0.7 * cross], [0.7 * cross.T, 0.49 * line]])
    columns = np.zeros((27, 2))
    columns[:20, 0], columns[20:, 1] = 1.0, 1.0
    y, errors = np.concatenate([f1, f2]), np.concatenate([e1, e2])
    expected = integrated(y, both + np.diag(errors**2), columns)
    pair = make_pair(t1, f1, e1, t2, f2, e2)
    assert joint_log_likelihood(pair, [12.0], 0.3, 40.0, 0.7, response)[0] == pytest.approx(
        expected, rel=1e-8
    )


@pytest.mark.parametrize("tau", [0.5, 40.0, 3000.0])
@pytest.mark.parametrize("n", [12, 400])
def test_continuum_alone_agrees_with_celerite2(n, tau):
    t1, f1, e1, t2, f2, e2 = light_curves(n, n, 5)
    order = np.argsort(t1)
    t, y, err = t1[order], f1[order], e1[order]
    process = celerite2.GaussianProcess(celerite2.terms.RealTerm(a=0.09, c=1 / tau), t=t, yerr=err)
    ones = process.apply_inverse(np.ones(n)).sum()
    best = process.apply_inverse(y).sum() / ones
    expected = process.log_likelihood(y - best) + 0.5 * np.log(2 * np.pi / ones)
    found = continuum_factor(make_pair(t1, f1, e1, t2, f2, e2), 0.3, tau).log_likelihood
    assert found == pytest.approx(expected, rel=1e-8)


@pytest.mark.parametrize("seed", [5, 6])
def test_scale_is_averaged_over_its_prior(seed):
    """The quadrature against a fine sum over known scales."""
    pair = make_pair(*light_curves(seed, 25, 9))
    factor, response, lags = (
        continuum_factor(pair, 0.3, 40.0),
        Response("top_hat", 0.5),
        np.array([11.0]),
    )
    dex = np.linspace(-5, 5, 401) * 0.4
    known = [line_given(pair, factor, lags, response, 0.7 * 10**x)[0][0] for x in dex]
    prior = np.exp(-0.5 * (dex / 0.4) ** 2)
    expected = np.log(np.sum(prior * np.exp(np.array(known) - max(known))) / prior.sum()) + max(
        known
    )
    found, best = line_given(pair, factor, lags, response, 0.7, 0.4)
    assert found[0] == pytest.approx(expected, abs=3e-3)
    assert best[0] == pytest.approx(0.7 * 10 ** dex[np.argmax(np.log(prior) + known)], rel=0.05)


@pytest.mark.parametrize("bad", [(0.0, 5.0, 1.0), (1.0, -5.0, 1.0), (1.0, 5.0, np.nan)])
def test_impossible_parameters_are_refused(bad):
    with pytest.raises(ValueError, match="need sigma, tau_d and scale > 0"):
        joint_log_likelihood(make_pair(*light_curves(7, 5, 4)), [1.0], *bad, Response())
