from dataclasses import replace

import numpy as np
import pytest

from planner.kernels.products import inverse_factor, product
from planner.recovery.ambiguity import ambiguity
from planner.recovery.expected import expected_recovery
from planner.recovery.information import (
    fisher_forecast,
    knapp_carter_error,
    make_design,
    with_normal_points,
)
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
        pytest.param((4, 100, 1.0, 600), 4.10, 5.48, marks=pytest.mark.slow),
        pytest.param((7, 300, 0.5, 1500), 3.02, 3.84, marks=pytest.mark.slow),
        pytest.param((1, 50, 0.3, 180), 0.30, 0.87, marks=pytest.mark.slow),
    ],
)
def test_bounds_on_even_grids(grid, sharp, wide):
    """Bounds for a lag near 60 d, all else known, pure delay and 20 d top hat, computed
    independently from F = 1/2 tr(C^-1 C' C^-1 C')."""
    for width, expected in ((0.0, sharp), (20.0, wide)):
        found = fisher_forecast(even(*grid, width), 0.0, 0.0, 0.0, offsets_known=True)
        assert found.error_known_d == pytest.approx(expected, rel=0.05)
        assert found.error_d == pytest.approx(found.error_known_d, rel=1e-12)


@pytest.mark.slow
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


def joint_blocks(one, lag, tau, width_lag):
    response = replace(one.response, width=one.response.width * width_lag / lag)
    own = np.exp(-np.abs(one.t1_d[:, None] - one.t1_d) / tau)
    cross = cross_covariance(one.t1_d, one.t2_d, [lag], tau, response)[0]
    line = line_covariance(one.t2_d, [lag], tau, response)[0]
    return own, cross, line


def joint_covariance(one, lag, sigma, tau, scale):
    """Dense covariance of both curves without errors; the width stays that of the truth."""
    own, cross, line = joint_blocks(one, lag, tau, one.lag_d)
    return sigma**2 * np.block([[own, scale * cross], [scale * cross.T, scale**2 * line]])


@pytest.mark.parametrize("telescopes", [1, 2])
@pytest.mark.parametrize("offsets_known", [False, True])
def test_information_agrees_with_the_dense_joint_form(telescopes, offsets_known):
    """1/2 tr(P C_i P C_j) from dense matrices of both curves, derivatives by differences."""
    labels = np.arange(20) % telescopes
    one = replace(design(), offsets=(labels[:, None] == np.arange(telescopes)).astype(float))
    truth = np.array([one.lag_d, one.sigma, one.tau_d, one.scale])
    slopes = []
    for k in range(4):
        step = np.zeros(4)
        step[k] = 1e-5 * truth[k]
        slope = joint_covariance(one, *(truth + step)) - joint_covariance(one, *(truth - step))
        slopes.append(slope / (2e-5 * (truth[k] if k == 0 else 1.0)))
    covariance = joint_covariance(one, *truth) + np.diag(np.concatenate([one.e1, one.e2]) ** 2)
    columns = np.zeros((29, telescopes + 1))
    columns[:20, :telescopes], columns[20:, telescopes] = one.offsets, 1.0
    inverse = np.linalg.inv(covariance)
    if not offsets_known:
        solved = inverse @ columns
        inverse = inverse - solved @ np.linalg.solve(columns.T @ solved, solved.T)
    products = [inverse @ slope for slope in slopes]
    expected = np.array([[0.5 * np.trace(a @ b) for b in products] for a in products])
    found = fisher_forecast(one, offsets_known=offsets_known).matrix
    size = np.sqrt(np.diag(expected))
    np.testing.assert_allclose(
        found / np.outer(size, size), expected / np.outer(size, size), atol=1e-6
    )


def test_a_known_walk_does_not_touch_the_rest():
    full, known = fisher_forecast(design()), fisher_forecast(design(), 0.0, 0.0)
    assert known.matrix[0, 3] == pytest.approx(full.matrix[0, 3], rel=1e-12)
    assert known.matrix[3, 3] == pytest.approx(full.matrix[3, 3], rel=1e-12)
    assert np.isinf(known.matrix[[1, 2], [1, 2]]).all()
    assert full.error_known_d <= known.error_d <= full.error_d


@pytest.mark.parametrize(("p", "q", "n"), [(1, 1, 1), (4, 8, 5), (7, 6, 3), (13, 5, 40)])
def test_products_agree_with_numpy(p, q, n):
    rng = np.random.default_rng(p)
    a, b = rng.standard_normal((p, n)), rng.standard_normal((q, n))
    np.testing.assert_allclose(product(a, b), a @ b.T, rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("m", [1, 4, 11])
def test_inverse_factor_agrees_with_numpy(m):
    a = np.random.default_rng(m).standard_normal((m, m + 2))
    a = a @ a.T
    expected = np.linalg.inv(np.linalg.cholesky(a))
    np.testing.assert_allclose(inverse_factor(a), expected, rtol=1e-8, atol=1e-10)
    assert np.isnan(inverse_factor(-a)).all()


def test_normal_points_are_weighted_means_by_telescope():
    t1 = np.array([0.0, 0.4, 0.6, 5.0, 9.0])
    one = make_design(
        t1, [0.1, 0.2, 0.1, 0.1, 0.3], t1, 0.2, 10.0, 1.0, 30.0, 1.0, HALF, [0, 0, 1, 1, 0]
    )
    found = with_normal_points(one, 1.0 / 9.0)  # bins of a ninth of the span of 9 d
    np.testing.assert_allclose(found.t1_d, [0.08, 0.6, 5.0, 9.0])
    np.testing.assert_allclose(found.e1, [(1 / 0.01 + 1 / 0.04) ** -0.5, 0.1, 0.1, 0.3])
    np.testing.assert_array_equal(found.offsets[:, 0], [1, 0, 0, 1])
    np.testing.assert_allclose(found.t2_d, [1.0 / 3.0, 5.0, 9.0])
    assert found.e2[0] == pytest.approx(0.2 / 3**0.5)
    apart = with_normal_points(one, 1e-3)
    np.testing.assert_allclose(apart.t1_d, one.t1_d, rtol=1e-14)
    np.testing.assert_allclose(apart.e1, one.e1)


def test_normal_points_keep_the_information():
    t = np.arange(0.0, 180.0)
    one = make_design(t, 0.05, t[::2], 0.05, 40.0, 0.2, 100.0, 0.7, HALF)
    few = with_normal_points(one, 1.0 / 16.0)
    assert few.t1_d.size < 0.5 * one.t1_d.size
    ratio = fisher_forecast(few, 0.0, 0.0).error_d / fisher_forecast(one, 0.0, 0.0).error_d
    assert ratio == pytest.approx(1.0, abs=0.03)


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
