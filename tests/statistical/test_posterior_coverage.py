"""Whether 68 % intervals hold the truth 68 % of the time, over data drawn from the model."""

import numpy as np
import pytest
from scipy.stats import binom, kstest

from planner.lightcurves import draw_pair
from planner.recovery.expected import expected_recovery
from planner.recovery.information import make_design
from planner.recovery.posterior import Belief, lag_posterior

pytestmark = [pytest.mark.slow, pytest.mark.statistical]

BELIEF = Belief(60.0, 0.3, 0.15, 0.2, 0.6, 0.15)
# Seasons, epochs of either curve, errors over the rms of either, range of lags.
CASES = {
    "dense": (((0, 160),), 120, 40, 0.05, 0.10, 2, 80),
    "sparse": (((0, 160),), 25, 12, 0.10, 0.15, 2, 80),
    "gap": (((0, 120), (365, 485)), 100, 40, 0.08, 0.12, 5, 300),
    "noisy": (((0, 160),), 80, 40, 0.50, 0.70, 2, 80),
    "short": (((0, 60),), 60, 20, 0.08, 0.12, 2, 60),
}


def drawn(case, rng):
    """One design with everything drawn from the belief, and the posterior of data at its epochs."""
    seasons, n1, n2, noise1, noise2, lo, hi = CASES[case]
    t1, t2 = (
        np.sort([rng.uniform(*seasons[k]) for k in rng.integers(0, len(seasons), n)])
        for n in (n1, n2)
    )
    lag, response = rng.uniform(lo, hi), BELIEF.responses[rng.integers(3)]
    tau = BELIEF.tau_d * 10 ** (BELIEF.tau_dex * rng.standard_normal())
    sigma = BELIEF.sigma * 10 ** (BELIEF.sigma_dex * rng.standard_normal())
    scale = BELIEF.scale * 10 ** (BELIEF.scale_dex * rng.standard_normal())
    x, y = draw_pair(rng, t1, t2, tau, lag, response.width * lag)
    e1, e2 = noise1 * BELIEF.sigma, noise2 * BELIEF.sigma * BELIEF.scale
    f1 = 1.0 + sigma * x + e1 * rng.standard_normal(n1)
    f2 = 1.0 + sigma * scale * y + e2 * rng.standard_normal(n2)
    design = make_design(t1, e1, t2, e2, lag, sigma, tau, scale, response)
    return design, lag_posterior(t1, f1, e1, t2, f2, e2, lo, hi, BELIEF)


@pytest.fixture(scope="module", params=CASES)
def trials(request):
    """Name of a case and its trials."""
    return request.param, [drawn(request.param, np.random.default_rng((1, k))) for k in range(80)]


def probability_below(found, lag):
    steps = 0.5 * np.diff(found.lags_d) * (found.density[1:] + found.density[:-1])
    return np.interp(lag, found.lags_d, np.concatenate([[0.0], np.cumsum(steps)]))


def test_intervals_are_honest(trials):
    """Within what chance allows (1 in 1000) of a true coverage between 63 and 73 %."""
    pairs = [(found, design.lag_d) for design, found in trials[1]]
    inside = sum(found.lag_lo_d <= lag <= found.lag_hi_d for found, lag in pairs)
    assert binom.ppf(5e-4, 80, 0.63) <= inside <= binom.ppf(1 - 5e-4, 80, 0.73)
    assert kstest([probability_below(*pair) for pair in pairs], "uniform").pvalue > 1e-3


def test_recoveries_are_as_frequent_as_expected(trials):
    """Expected success of the same designs, within 0.06 and what chance allows (1 in 1000)."""
    case, pairs = trials
    lo, hi = CASES[case][-2:]
    success = sum(
        abs(found.lag_d - design.lag_d) <= 0.3 * design.lag_d
        and 0.5 * (found.lag_hi_d - found.lag_lo_d) < 0.3 * found.lag_d
        for design, found in pairs
    )
    designs = [design for design, _ in pairs]
    expected = expected_recovery(designs, lo, hi, 0.3, 0.3, np.random.default_rng(2), 6).success
    low, high = np.clip([expected - 0.06, expected + 0.06], 0.0, 1.0)
    assert binom.ppf(5e-4, 80, low) <= success <= binom.ppf(1 - 5e-4, 80, high)
