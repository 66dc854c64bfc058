"""An observer's own curves: good ones give their lag, unrelated ones give none."""

import numpy as np
import pytest

from planner.campaign.cuts import cuts_named
from planner.lightcurves import draw_pair
from planner.scoring import Curves, recover_own

pytestmark = [pytest.mark.slow, pytest.mark.statistical]

USUAL = cuts_named("usual")
LAG_D, TAU_D, RMS = 20.0, 40.0, 0.1


def curves(seed, *, related):
    """Daily continuum and a line every other day for 160 d; errors 5 and 10 % of the rms."""
    rng = np.random.default_rng((9, seed))
    t1, t2 = (
        np.arange(0.0, 160.0, step) + rng.uniform(-0.1, 0.1, int(160 / step)) for step in (1, 2)
    )
    x, y = draw_pair(rng, t1, t2, TAU_D, LAG_D, 0.8 * LAG_D)
    if not related:
        _, y = draw_pair(rng, t1, t2, TAU_D, LAG_D, 0.8 * LAG_D)
    e1, e2 = np.full(t1.size, 0.05 * RMS), np.full(t2.size, 0.1 * RMS)
    f1 = 1.0 + RMS * x + e1 * rng.standard_normal(t1.size)
    return Curves(t1, f1, e1, t2, 1.0 + RMS * y + e2 * rng.standard_normal(t2.size), e2)


@pytest.mark.parametrize("seed", [1, 2, 3, 4])
def test_both_methods_claim_the_lag_of_a_good_campaign(seed):
    found = recover_own(curves(seed, related=True), USUAL, seed, detrend=False)
    assert found.correlation_claim
    assert found.likelihood_claim
    assert found.correlation.lag_d == pytest.approx(LAG_D, rel=0.15)
    assert found.likelihood.lag_d == pytest.approx(LAG_D, rel=0.1)


def test_unrelated_lines_are_seldom_claimed():
    """In at least 90 % of a dozen."""
    found = [recover_own(curves(s, related=False), USUAL, s, detrend=False) for s in range(12)]
    assert np.mean([f.correlation_claim for f in found]) <= 0.1
    assert np.mean([f.likelihood_claim for f in found]) <= 0.1
