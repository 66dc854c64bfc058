import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.stats import binom

from planner.scoring.intervals import wilson
from planner.scoring.sequence import (
    ALPHA,
    final_bounds,
    log_evidence_above,
    log_evidence_below,
    sequence_bounds,
)


@pytest.mark.parametrize(("k", "n", "g"), [(0, 0, 0.5), (7, 10, 0.5), (2, 10, 0.8), (95, 100, 0.9)])
def test_evidence_is_the_mean_likelihood_ratio_over_the_shares_above(k, n, g):
    mean, _ = quad(lambda q: binom.pmf(k, n, q), g, 1.0)
    expected = np.log(mean / (1.0 - g) / binom.pmf(k, n, g))
    assert log_evidence_above(k, n, g) == pytest.approx(expected, abs=1e-9)
    assert log_evidence_below(n - k, n, 1.0 - g) == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize("n", [1, 10, 60])
@pytest.mark.parametrize("g", [0.3, 0.8])
def test_evidence_is_one_on_average_at_the_share_and_less_below_it(n, g):
    k = np.arange(n + 1)
    evidence = np.exp(log_evidence_above(k, n, g))
    assert binom.pmf(k, n, g) @ evidence == pytest.approx(1.0, abs=1e-9)
    assert binom.pmf(k, n, g - 0.2) @ evidence < 1.0


@pytest.mark.statistical
@pytest.mark.parametrize("share", [0.5, 0.8])
def test_bounds_hold_at_all_looks_together(share):
    # Ville's inequality: at most one run in ten ever excludes the truth, looked at each trial.
    runs, trials = 1500, 200
    rng = np.random.default_rng(5)
    hits = np.cumsum(rng.random((runs, trials)) < share, axis=1)
    n = np.arange(1, trials + 1)
    ever = (log_evidence_above(hits, n, share) >= -np.log(ALPHA)).any(axis=1)
    assert ever.mean() <= ALPHA + 3 * np.sqrt(ALPHA * (1 - ALPHA) / runs)
    # A bound for one look alone, looked at as often, fails far more often.
    lo, _ = wilson(hits, np.broadcast_to(n, hits.shape))
    assert (lo > share).any(axis=1).mean() > 2.5 * ALPHA


@given(st.integers(0, 400), st.integers(0, 400))
def test_bounds_enclose_the_share_found_and_are_the_edge_of_what_is_excluded(a, b):
    k, n = min(a, b), max(a, b)
    lo, hi = sequence_bounds(k, n)
    assert 0.0 <= lo <= (k / n if n else 0.5) <= hi <= 1.0
    for bound, evidence in ((lo, log_evidence_above), (hi, log_evidence_below)):
        if 1e-9 < bound < 1 - 1e-9:
            assert evidence(k, n, bound) == pytest.approx(-np.log(ALPHA), abs=1e-6)


def test_no_trials_exclude_nothing():
    lo, hi = sequence_bounds(np.zeros(2), np.zeros(2))
    np.testing.assert_array_equal(lo, 0.0)
    np.testing.assert_array_equal(hi, 1.0)


def test_the_last_look_is_tighter_than_those_along_the_way():
    lo, hi = final_bounds([85, 85], [100, 100], 100)
    early_lo, early_hi = final_bounds([85, 85], [100, 100], 200)
    assert (lo > early_lo).all()
    assert (hi < early_hi).all()
    expected = wilson(85, 100, 1.6448536269514722)
    assert (lo[0], hi[0]) == pytest.approx((float(expected[0]), float(expected[1])))
