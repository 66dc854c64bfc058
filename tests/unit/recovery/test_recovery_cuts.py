from dataclasses import replace

import numpy as np
import pytest

from planner.model.campaign import SuccessRule
from planner.recovery import is_claim, is_right, passes_cuts, recover_lag

RULE = SuccessRule(goal=0.8, within=0.3, error_below=0.3, r_max_above=0.5, sigma_above=2.0)


@pytest.mark.parametrize(
    ("lag", "lo", "hi", "r_max", "claim"),
    [
        (20.0, 18.0, 23.0, 0.8, True),
        (20.0, 18.0, 23.0, 0.5, False),  # peak no higher than asked
        (20.0, 14.0, 26.0, 0.8, False),  # half-width no smaller than 30 %
        (20.0, 15.0, 26.0, 0.8, True),
        (20.0, 10.0, 21.0, 0.8, False),  # exactly two lower errors from zero
        (20.0, 10.1, 21.0, 0.8, True),
        (-20.0, -21.0, -19.0, 0.8, False),
        (0.0, 0.0, 0.0, 0.8, False),
        (np.nan, np.nan, np.nan, 0.8, False),
    ],
)
def test_each_cut(lag, lo, hi, r_max, claim):
    assert passes_cuts(lag, lo, hi, r_max, 0.9, RULE) == claim


def test_cuts_work_elementwise():
    lags = np.array([[20.0, -3.0, np.nan]])
    assert passes_cuts(lags, lags - 1, lags + 1, 0.9, 0.9, RULE).tolist() == [[True, False, False]]


def test_right_is_within_the_fraction_of_the_truth_on_either_side():
    lags = np.array([13.9, 14.0, 20.0, 26.0, 26.1, -20.0, np.nan])
    assert is_right(lags, 20.0, 0.3).tolist() == [False, True, True, True, False, False, False]


def test_claim_of_a_result_does_not_know_the_truth():
    t = np.arange(0.0, 60.0, 2.0)
    early, late = np.sin(t / 7), np.sin((t - 8) / 7)
    lags, rng = np.arange(-10.0, 21.0), np.random.default_rng(0)
    result = recover_lag(t, early, 0.01, t, late, 0.01, lags, 12, rng)
    assert is_claim(result, RULE)
    assert not is_right(result.lag_d, 16.0, RULE.within)
    assert not is_claim(result, replace(RULE, r_max_above=1.0))
