import numpy as np
import pytest
from scipy import stats

from planner.scoring.intervals import Z_90_ONE_SIDED, wilson


@pytest.mark.parametrize(("hits", "trials"), [(0, 10), (3, 10), (10, 10), (83, 100), (999, 1000)])
def test_wilson_agrees_with_scipy(hits, trials):
    expected = stats.binomtest(hits, trials).proportion_ci(0.8, method="wilson")
    lower, upper = wilson(hits, trials)
    assert lower == pytest.approx(expected.low, abs=1e-12)
    assert upper == pytest.approx(expected.high, abs=1e-12)


def test_quantile_is_that_of_ninety_per_cent():
    assert pytest.approx(stats.norm.ppf(0.9), abs=1e-14) == Z_90_ONE_SIDED


def test_no_trials_say_nothing():
    lower, upper = wilson([0, 1], [0, 1])
    assert (lower[0], upper[0]) == (0, 1)


def test_each_end_holds_in_nine_of_ten_cases():
    rng = np.random.default_rng(3)
    truth = rng.uniform(0.05, 0.95, 20000)
    lower, upper = wilson(rng.binomial(100, truth), 100)
    assert np.mean(truth >= lower) == pytest.approx(0.9, abs=0.015)
    assert np.mean(truth <= upper) == pytest.approx(0.9, abs=0.015)
