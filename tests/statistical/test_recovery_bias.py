"""Published biases of lags and timescales from data that are too short."""

import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.stats import binom

from planner.lightcurves import draw_pair
from planner.recovery import drw_log_likelihood, recover_lag

pytestmark = [pytest.mark.slow, pytest.mark.statistical]

LAG_D, SLOW_D = 20.0, 100.0


def recovered_over_true(season_d, reach_d, seeds):
    """Centroids of daily curves with errors of a tenth of the rms, over the true lag."""
    t = np.arange(0.0, season_d)
    lags = np.linspace(-reach_d, reach_d, 161)
    ratios = []
    for seed in range(seeds):
        rng = np.random.default_rng((3, seed))
        x, y = draw_pair(rng, t, t + 0.5, SLOW_D, LAG_D, LAG_D)
        f1, f2 = (f + 0.1 * rng.standard_normal(f.size) for f in (x, y))
        found = recover_lag(t, f1, 0.1, t + 0.5, f2, 0.1, lags, 0, rng)
        ratios.append(found.centroid_d / LAG_D)
    return np.array(ratios)[np.isfinite(ratios)]


def test_short_seasons_bias_correlation_lags_low():
    """Finite length and red noise do, not errors or sampling (Welsh 1999, PASP 111, 1347)."""
    short, long = recovered_over_true(60.0, 40.0, 400), recovered_over_true(2000.0, 80.0, 60)
    assert np.median(short) < 1.0
    assert np.sum(short < 1.0) > binom.ppf(0.999, short.size, 0.5)
    assert abs(1.0 - np.median(long)) < 0.5 * (1.0 - np.median(short))
    assert np.mean(short) < 0.8
    assert np.mean(long) == pytest.approx(1.0, abs=0.02)


BASELINE_D, EPOCHS = 1000.0, 60  # 60 epochs: one of the cadences of the published simulations


def fitted_timescale(tau_d, rng):
    """Most likely damping timescale over the baseline; the mean is the sample's."""
    t = np.sort(rng.uniform(0.0, BASELINE_D, EPOCHS))
    flux = draw_pair(rng, t, t[:1], tau_d, 0.0, 0.0)[0] + 0.05 * rng.standard_normal(EPOCHS)

    def unlikely(logs):
        return -drw_log_likelihood(t, flux, 0.05, *np.exp(logs), float(flux.mean()))

    fits = [
        minimize(unlikely, [np.log(flux.std()), np.log(share * BASELINE_D)], method="Nelder-Mead")
        for share in (0.1, 0.5)
    ]
    return np.exp(min(fits, key=lambda fit: fit.fun).x[1]) / BASELINE_D


@pytest.mark.parametrize("tau_d", [1000.0, 3000.0, 10000.0])
def test_short_baselines_give_timescales_of_a_quarter_of_them(tau_d):
    """20 to 30 % of the baseline whatever the truth (Kozlowski 2017, A&A 597, A128, fig. 2)."""
    fitted = [fitted_timescale(tau_d, np.random.default_rng((4, seed))) for seed in range(80)]
    middle = np.median(fitted)
    # Error of a median: 1.25 sigma / sqrt(n) of its logarithm.
    error = 1.25 * np.std(np.log(np.clip(fitted, 0.02, 2.0))) / np.sqrt(80)
    assert 0.2 * np.exp(-3.0 * error) < middle < 0.3 * np.exp(3.0 * error)
    assert middle < 0.5 * tau_d / BASELINE_D


def test_long_baselines_give_the_true_timescale():
    """Over ten times the timescale there is little bias (same source)."""
    fitted = [fitted_timescale(30.0, np.random.default_rng((5, seed))) for seed in range(80)]
    assert np.median(fitted) == pytest.approx(0.03, rel=0.25)
