"""What must not change the posterior of a lag, and what may not break it."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.lightcurves import draw_pair
from planner.recovery.discrete import discrete_correlation, discrete_lag
from planner.recovery.posterior import Belief, lag_posterior
from planner.recovery.response import Response

pytestmark = pytest.mark.slow

SHARP = Belief(20.0, responses=(Response("top_hat", 0.0),))
SEEDS = st.integers(0, 2**32 - 1)
FEW = settings(deadline=None, max_examples=15)


def light_curves(seed):
    rng = np.random.default_rng(seed)
    t1, t2 = np.sort(rng.uniform(0, 60, 25)), np.sort(rng.uniform(0, 60, 12))
    x, y = draw_pair(rng, t1, t2, 20.0, 8.0, 0.0)
    f1, f2 = x + 0.2 * rng.standard_normal(25), y + 0.2 * rng.standard_normal(12)
    return t1, f1, np.full(25, 0.2), t2, f2, np.full(12, 0.2)


def summary(found):
    return [found.lag_lo_d, found.lag_d, found.lag_hi_d]


@FEW
@given(SEEDS, st.floats(-1e4, 1e5))
def test_shifting_both_curves_changes_nothing(seed, shift):
    t1, f1, e1, t2, f2, e2 = light_curves(seed)
    before = lag_posterior(t1, f1, e1, t2, f2, e2, 0.0, 30.0, Belief(20.0))
    after = lag_posterior(t1 + shift, f1, e1, t2 + shift, f2, e2, 0.0, 30.0, Belief(20.0))
    assert summary(after) == pytest.approx(summary(before), abs=1e-4)


@FEW
@given(SEEDS, st.floats(-20.0, 50.0))
def test_shifting_the_line_moves_the_lag(seed, shift):
    t1, f1, e1, t2, f2, e2 = light_curves(seed)
    before = lag_posterior(t1, f1, e1, t2, f2, e2, 0.0, 30.0, SHARP)
    after = lag_posterior(t1, f1, e1, t2 + shift, f2, e2, shift, 30.0 + shift, SHARP)
    assert np.array(summary(after)) - shift == pytest.approx(summary(before), abs=1e-4)


@FEW
@given(SEEDS, st.floats(1e-3, 1e3), st.floats(1e-3, 1e3), st.floats(-100, 100))
def test_units_and_means_of_the_fluxes_change_nothing(seed, unit1, unit2, mean):
    t1, f1, e1, t2, f2, e2 = light_curves(seed)
    before = lag_posterior(t1, f1, e1, t2, f2, e2, 0.0, 30.0, Belief(20.0))
    scaled = (t1, unit1 * (f1 + mean), unit1 * e1, t2, unit2 * (f2 - mean), unit2 * e2)
    after = lag_posterior(*scaled, 0.0, 30.0, Belief(20.0))
    assert summary(after) == pytest.approx(summary(before), abs=1e-4)


@FEW
@given(SEEDS, st.floats(1e-3, 1e3))
def test_the_unit_of_time_is_free(seed, unit):
    t1, f1, e1, t2, f2, e2 = light_curves(seed)
    before = lag_posterior(t1, f1, e1, t2, f2, e2, 0.0, 30.0, Belief(20.0))
    belief = replace(Belief(20.0), tau_d=20.0 * unit)
    after = lag_posterior(unit * t1, f1, e1, unit * t2, f2, e2, 0.0, 30.0 * unit, belief)
    assert np.array(summary(after)) / unit == pytest.approx(summary(before), abs=1e-4)


NUMBERS = st.one_of(
    st.sampled_from([0.0, 1.0, -1.0, np.nan, np.inf, -np.inf, 1e-300, 1e30]), st.floats(-50, 50)
)
ROWS = st.lists(st.tuples(NUMBERS, NUMBERS, NUMBERS), max_size=14)


@settings(deadline=None, max_examples=60)
@given(ROWS, ROWS, NUMBERS, NUMBERS)
def test_any_data_get_an_answer_or_a_reason(rows1, rows2, lo, hi):
    one, two = (np.array(rows, dtype=float).reshape(-1, 3).T for rows in (rows1, rows2))
    found = lag_posterior(*one, *two, lo, hi, SHARP)
    assert bool(found.reason) == bool(np.isnan(found.lag_d))
    if not found.reason:
        assert lo <= found.lag_lo_d <= found.lag_d <= found.lag_hi_d <= hi
    discrete = discrete_lag(discrete_correlation(*one, *two, lo, hi))
    assert bool(discrete.reason) == bool(np.isnan(discrete.lag_d))
