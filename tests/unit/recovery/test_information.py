from dataclasses import replace

import numpy as np
import pytest

from planner.kernels.joint_forecast import log_likelihoods
from planner.recovery.ambiguity import ambiguity
from planner.recovery.expected import expected_recovery
from planner.recovery.information import fisher_forecast, knapp_carter_error, make_design
from planner.recovery.joint import joint_log_likelihood, make_pair
from planner.recovery.response import Response, cross_covariance, line_covariance

HALF = Response("top_hat", 0.5)


def design(n=20, m=9, lag=10.0, response=HALF, error=0.03, seed=0):
    rng = np.random.default_rng(seed)
    return make_design(
        rng.uniform(0, 60, n), error, rng.uniform(0, 60, m), error, lag, 0.2, 30.0, 0.7, response
    )


def even(dt, tau, noise, duration, width):
    """Design of the published-form check: both curves on one even grid, lag half a step off it."""
    t, lag = np.arange(0.0, duration + 0.1, dt), 60.0 + 0.5 * dt
    return make_design(t, noise, t, noise, lag, 1.0, tau, 1.0, Response("top_hat", width / lag))


@pytest.mark.parametrize(
    ("grid", "sharp", "wide"),
    [
        ((4, 100, 0.2, 600), 0.44, 0.82),
        ((4, 100, 1.0, 600), 4.10, 5.48),
        ((7, 300, 0.5, 1500), 3.02, 3.84),
        ((1, 50, 0.3, 180), 0.30, 0.87),
    ],
)
def test_bounds_on_even_grids(grid, sharp, wide):
    """Bounds for a lag near 60 d, all else known, pure delay and 20 d top hat, computed
    independently from F = 1/2 tr(C^-1 C' C^-1 C')."""
    for width, expected in ((0.0, sharp), (20.0, wide)):
        found = fisher_forecast(even(*grid, width), 0.0, 0.0, 0.0, offsets_known=True)
        assert found.error_known_d == pytest.approx(expected, rel=0.05)
        assert found.error_d == pytest.approx(found.error_known_d, rel=1e-12)


@pytest.mark.parametrize("grid", [(4, 100, 1.0, 600), (7, 300, 0.5, 1500)])
def test_approaches_the_bound_for_continuous_observation(grid):
    dt, tau, noise, duration = grid
    found = fisher_forecast(even(*grid, 0.0), 0.0, 0.0, 0.0, offsets_known=True)
    bound = knapp_carter_error(dt, duration, tau, noise)
    assert bound == pytest.approx(found.error_known_d, rel=0.06)


def top_hat_slope(d, w, tau):
    """Derivative by the lag of the closed form, d = line time - lag - continuum time."""
    return -(np.exp(-np.abs(d + w / 2) / tau) - np.exp(-np.abs(d - w / 2) / tau)) / w


def test_information_agrees_with_the_closed_derivative():
    one = design()
    n, t1, t2 = 20, one.t1_d, one.t2_d
    own = np.exp(-np.abs(t1[:, None] - t1) / 30)
    cross = cross_covariance(t1, t2, [10.0], 30.0, one.response)[0]
    line = line_covariance(t2, [10.0], 30.0, one.response)[0]
    both = 0.04 * np.block([[own, 0.7 * cross], [0.7 * cross.T, 0.49 * line]]) + 0.03**2 * np.eye(
        29
    )
    slope = np.zeros((29, 29))
    slope[:n, n:] = 0.04 * 0.7 * top_hat_slope(t2 - 10.0 - t1[:, None], 5.0, 30.0)
    slope += slope.T
    inverse = np.linalg.inv(both)
    product = inverse @ slope
    expected = (0.5 * np.trace(product @ product)) ** -0.5
    found = fisher_forecast(one, 0.0, 0.0, 0.0, offsets_known=True)
    assert found.error_known_d == pytest.approx(expected, rel=1e-7)


def test_information_is_the_curvature_of_the_divergence():
    """D(lag + h) = 1/2 F h^2 for small h; a sharp response, whose width does not follow the lag."""
    one, h = design(m=14, response=Response("top_hat", 0.0), error=0.3), 1e-2
    divergence = ambiguity(one, [10.0 - h, 10.0 + h]).divergence.mean()
    information = fisher_forecast(one, 0.0, 0.0, 0.0).error_known_d ** -2
    assert 2 * divergence / h**2 == pytest.approx(information, rel=0.05)


def test_ignorance_widens_and_priors_narrow():
    one = design()
    free = fisher_forecast(one)
    believed = fisher_forecast(one, 0.2, 0.3, 0.15)
    assert free.error_d >= believed.error_d >= free.error_known_d > 0.0
    assert free.error_known_d >= fisher_forecast(one, offsets_known=True).error_known_d
    assert believed.matrix[3, 3] - free.matrix[3, 3] == pytest.approx((0.15 * np.log(10)) ** -2)
    assert np.linalg.eigvalsh(free.matrix).min() > 0.0


def test_divergence_is_the_mean_log_likelihood_ratio():
    """Against the likelihood itself, averaged over data drawn from the dense covariance."""
    one, other = design(), 13.0
    t1, t2 = one.t1_d, one.t2_d
    own = np.exp(-np.abs(t1[:, None] - t1) / 30)
    cross = 0.7 * cross_covariance(t1, t2, [10.0], 30.0, one.response)[0]
    line = 0.49 * line_covariance(t2, [10.0], 30.0, one.response)[0]
    both = 0.04 * np.block([[own, cross], [cross.T, line]]) + 0.03**2 * np.eye(29)
    lower = np.linalg.cholesky(both)
    rng = np.random.default_rng(1)
    ratios = []
    for _ in range(150):
        y = lower @ rng.standard_normal(29)
        pair = make_pair(t1, y[:20], 0.03, t2, y[20:], 0.03)
        at = joint_log_likelihood(pair, [10.0, other], 0.2, 30.0, 0.7, one.response)
        ratios.append(at[0] - at[1])
    found = ambiguity(one, [10.0, other])
    assert found.divergence[0] == pytest.approx(0.0, abs=1e-9)
    error = np.std(ratios) / np.sqrt(150)
    assert found.divergence[1] == pytest.approx(np.mean(ratios), abs=3.5 * error)
    assert found.mistaken[1] == pytest.approx(np.mean(np.array(ratios) < 0), abs=0.12)


def test_a_gap_makes_lags_ambiguous():
    """Half a year's lag throws the line's season into the continuum's gap."""
    season = np.arange(0.0, 120.0, 4.0)
    t = np.concatenate([season, season + 365])
    one = make_design(t, 0.02, t, 0.02, 182.0, 0.2, 60.0, 1.0, Response("top_hat", 0.2))
    near = replace(one, lag_d=20.0)
    assert ambiguity(one, [170.0]).divergence[0] < 0.1 * ambiguity(near, [8.0]).divergence[0]


def test_kernel_agrees_with_dense_algebra():
    rng = np.random.default_rng(2)
    white, white0 = 0.1 * rng.standard_normal((2, 12, 6))
    line, err = np.eye(6) + 0.3, rng.uniform(0.2, 0.4, 6)
    normals, noise = rng.standard_normal((12, 3)), rng.standard_normal((6, 3))
    offsets = 0.1 * rng.standard_normal((2, 6))
    found = log_likelihoods(white, white0, offsets, line, err, 0.8, normals, noise, 2.0)
    unit = line - white.T @ white + offsets.T @ offsets
    covariance = 0.64 * unit + np.diag(err**2)
    for c in range(3):
        column = 0.8 * white.T @ normals[:, c]
        # The offset's flat prior as a wide one; the ratio of its density to 1 is put back.
        wide = covariance + np.outer(column, column) / 2.0 + 1e6
        rest = 0.8 * (white0 - white).T @ normals[:, c] + noise[:, c]
        expected = -0.5 * (rest @ np.linalg.solve(wide, rest) + np.linalg.slogdet(wide)[1])
        assert found[c] == pytest.approx(expected + 0.5 * np.log(1e6), abs=1e-4)


def test_expected_recovery_tells_good_from_bad():
    settings = (1.0, 40.0, 0.3, 0.3)
    good = [design(60, 25, error=0.004, seed=k) for k in range(2)]
    bad = [design(20, 9, error=0.3, seed=k) for k in range(2)]
    high = expected_recovery(good, *settings, np.random.default_rng(0), 8)
    low = expected_recovery(bad, *settings, np.random.default_rng(0), 8)
    assert high.success > 0.7
    assert low.success < 0.2
    assert high.simulations == 16
    assert high.success <= min(high.claims, high.right)
    again = expected_recovery(good, *settings, np.random.default_rng(0), 8)
    assert again == high


def test_a_prior_helps():
    bad = [design(20, 9, error=0.15, seed=k) for k in range(3)]
    settings = (1.0, 40.0, 0.3, 0.3, np.random.default_rng(0), 8)
    tight = expected_recovery(bad, *settings, prior=lambda lag: np.exp(-0.5 * (lag - 10) ** 2))
    assert tight.success == 1.0
    assert expected_recovery(bad, *settings).success < 0.9


@pytest.mark.parametrize("change", ["one epoch", "NaN", "no lag", "no walk"])
def test_impossible_designs_say_why(change):
    t, lag, tau = np.arange(9.0), 3.0, 20.0
    if change == "one epoch":
        t = t[:1]
    elif change == "NaN":
        t = t * np.nan
    elif change == "no lag":
        lag = np.nan
    else:
        tau = 0.0
    one = make_design(t, 0.1, t, 0.1, lag, 1.0, tau, 1.0, Response())
    assert one.reason
    assert fisher_forecast(one).reason == one.reason
    assert np.isnan(fisher_forecast(one).error_d)
    assert np.isnan(ambiguity(one, [1.0, 2.0]).divergence).all()
    found = expected_recovery([one], 1.0, 5.0, 0.3, 0.3, np.random.default_rng(0), 4)
    assert (found.success, found.reason) == (0.0, one.reason)


def test_no_overlap_is_no_information():
    one = make_design(
        np.arange(9.0), 0.1, np.arange(9.0) + 1e5, 0.1, 3.0, 1.0, 20.0, 1.0, Response()
    )
    assert fisher_forecast(one).error_d > 1e6
    assert ambiguity(one, [4.0]).divergence[0] == pytest.approx(0.0, abs=1e-9)
