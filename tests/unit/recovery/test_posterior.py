import numpy as np
import pytest

from planner.lightcurves import draw_pair
from planner.recovery.joint import joint_log_likelihood, make_pair
from planner.recovery.posterior import Belief, lag_posterior
from planner.recovery.response import Response

SHARP = (Response("top_hat", 0.0),)
KNOWN = Belief(30.0, 0.0, 0.2, 0.0, 0.7, 0.0, (Response("top_hat", 0.5),))
SIMPLE = Belief(30.0, 0.0, responses=SHARP)


def light_curves(seed=1, n=24, m=10, lag=10.0, span=60.0, error=0.01):
    rng = np.random.default_rng(seed)
    t1, t2 = np.sort(rng.uniform(0, span, n)), np.sort(rng.uniform(0, span, m))
    x, y = draw_pair(rng, t1, t2, 30.0, lag, 0.5 * lag)
    f1 = 1 + 0.2 * x + error * rng.standard_normal(n)
    f2 = 1 + 0.14 * y + error * rng.standard_normal(m)
    return t1, f1, np.full(n, error), t2, f2, np.full(m, error)


@pytest.mark.slow
def test_equals_the_likelihood_on_a_fine_grid_where_all_else_is_known():
    curves = light_curves(n=60, m=20)
    found = lag_posterior(*curves, 1.0, 40.0, KNOWN)
    fine = np.linspace(1.0, 40.0, 4001)
    log_l = joint_log_likelihood(make_pair(*curves), fine, 0.2, 30.0, 0.7, KNOWN.responses[0])
    density = np.exp(log_l - log_l.max())
    density /= np.trapezoid(density, fine)
    below = np.cumsum(density) / density.sum()
    expected = np.interp([0.16, 0.5, 0.84], below, fine)
    width = expected[2] - expected[0]
    assert [found.lag_lo_d, found.lag_d, found.lag_hi_d] == pytest.approx(
        expected, abs=0.05 * width
    )
    high = np.interp(found.lags_d, fine, log_l) > log_l.max() - 3.0
    exact = joint_log_likelihood(
        make_pair(*curves), found.lags_d[high], 0.2, 30.0, 0.7, KNOWN.responses[0]
    )
    assert np.ptp(found.log_density[high] - exact) < 1e-9


@pytest.mark.slow
def test_finds_the_lag_of_good_data():
    found = lag_posterior(
        *light_curves(n=80, m=30, span=90.0, error=0.004), 1.0, 50.0, Belief(30.0)
    )
    assert found.lag_d == pytest.approx(10.0, abs=3 * (found.lag_hi_d - found.lag_lo_d))
    assert found.lag_hi_d - found.lag_lo_d < 3.0
    assert found.primary_share > 0.9
    assert found.reason == ""


def test_record_is_consistent():
    found = lag_posterior(*light_curves(), 1.0, 40.0, KNOWN)
    assert np.all(np.diff(found.lags_d) > 0)
    assert (found.lags_d[0], found.lags_d[-1]) == (1.0, 40.0)
    assert np.trapezoid(found.density, found.lags_d) == pytest.approx(1.0)
    assert np.exp(found.log_density) == pytest.approx(found.density)
    assert found.lag_lo_d < found.lag_d < found.lag_hi_d
    assert found.peak_d == found.lags_d[np.argmax(found.density)] == found.aliases[0].lag_d
    assert found.primary_share == found.aliases[0].share
    assert sum(alias.share for alias in found.aliases) <= 1.0 + 1e-12


def test_prior_multiplies_the_density():
    flat = lag_posterior(*light_curves(), 1.0, 40.0, KNOWN)
    weighted = lag_posterior(*light_curves(), 1.0, 40.0, KNOWN, prior=lambda lag: np.exp(-lag / 5))
    ratio = weighted.log_density - flat.log_density + flat.lags_d / 5
    assert np.ptp(ratio) < 1e-9


def test_prior_may_exclude_lags_but_not_all():
    kept = lag_posterior(*light_curves(), 1.0, 40.0, KNOWN, prior=lambda lag: 1.0 * (lag > 20))
    assert kept.lag_lo_d > 19.0
    none = lag_posterior(*light_curves(), 1.0, 40.0, KNOWN, prior=lambda lag: 0.0 * lag)
    assert np.isnan(none.lag_d)
    assert none.reason == "no lag in the range searched is possible under the prior"


def test_offsets_between_telescopes_do_not_matter():
    t1, f1, e1, *line = light_curves()
    labels = np.arange(t1.size) % 2
    same = lag_posterior(t1, f1, e1, *line, 1.0, 40.0, KNOWN, telescope1=labels)
    moved = lag_posterior(t1, f1 + 3.0 * labels, e1, *line, 1.0, 40.0, KNOWN, telescope1=labels)
    assert moved.lag_d == pytest.approx(same.lag_d, rel=1e-6)
    assert lag_posterior(t1, f1, e1, *line, 1.0, 40.0, KNOWN).lag_d != same.lag_d


def test_order_and_unusable_epochs_do_not_matter():
    t1, f1, e1, t2, f2, e2 = light_curves()
    expected = lag_posterior(t1, f1, e1, t2, f2, e2, 1.0, 40.0, KNOWN)
    mixed = np.random.default_rng(0).permutation(t1.size)
    worse = [np.append(a[mixed], b) for a, b in zip((t1, f1, e1), (5.0, np.nan, 0.1), strict=True)]
    found = lag_posterior(*worse, t2, f2, e2, 1.0, 40.0, KNOWN)
    assert found.lag_d == pytest.approx(expected.lag_d, rel=1e-9)


T, F = np.arange(6.0), np.array([1.0, 1.2, 0.9, 1.1, 1.3, 0.8])
REFUSED = {
    "two points": ((T[:2], F[:2], 0.1, T, F, 0.1), "a light curve has fewer than 3 usable epochs"),
    "no points": (([], [], [], T, F, 0.1), "a light curve has fewer than 3 usable epochs"),
    "NaN": ((T, F * np.nan, 0.1, T, F, 0.1), "a light curve has fewer than 3 usable epochs"),
    "one time": ((T * 0, F, 0.1, T, F, 0.1), "all epochs of a light curve are at one time"),
    "constant": ((T, F * 0 + 1, 0.1, T, F, 0.1), "a light curve does not vary at all"),
    "constant, exact": ((T, F, 0.1, T, F * 0, 0.0), "a light curve does not vary at all"),
    "apart": (
        (T, F, 0.1, T + 900, F, 0.1),
        "the light curves overlap at no lag in the range searched",
    ),
}


@pytest.mark.parametrize("name", REFUSED)
def test_data_without_a_lag_say_why(name):
    data, reason = REFUSED[name]
    found = lag_posterior(*data, 0.0, 20.0, SIMPLE)
    assert found.reason == reason
    assert np.isnan([found.lag_d, found.lag_lo_d, found.lag_hi_d, found.peak_d]).all()
    assert found.lags_d.size == 0
    assert found.aliases == ()


@pytest.mark.parametrize("limits", [(5.0, 5.0), (9.0, 2.0), (np.nan, 3.0), (0.0, np.inf)])
def test_empty_range_says_so(limits):
    assert (
        lag_posterior(T, F, 0.1, T, F, 0.1, *limits, SIMPLE).reason == "the range of lags is empty"
    )


@pytest.mark.parametrize("error", [0.0, 1e-12, 1e6])
def test_extreme_errors_give_a_finite_answer(error):
    twice = np.repeat(T, 2)
    found = lag_posterior(twice, np.arange(12.0) % 5, error, T, F, error, -3.0, 3.0, SIMPLE)
    assert found.reason == ""
    assert -3.0 <= found.lag_lo_d <= found.lag_d <= found.lag_hi_d <= 3.0
