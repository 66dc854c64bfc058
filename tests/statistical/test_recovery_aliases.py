"""Two seasons half a year apart: wrong lags land where the information calls lags alike."""

import numpy as np
import pytest
from scipy.stats import binomtest

from planner.lightcurves import draw_pair
from planner.recovery import (
    Response,
    ambiguity,
    joint_log_likelihood,
    make_design,
    make_pair,
    recover_lag,
)

pytestmark = [pytest.mark.slow, pytest.mark.statistical]

SIGMA, SCALE, TAU_D, RESPONSE = 0.15, 0.6, 20.0, Response("top_hat", 0.8)
E1, E2 = 0.2 * SIGMA, 0.3 * SIGMA * SCALE
LAGS = np.linspace(0.0, 360.0, 121)
TRUE_D = (150.0, 182.0, 230.0)  # these throw one season under the gap


def epochs(cadence_d, rng):
    night = np.arange(0.0, 180.0, cadence_d)
    t = np.concatenate([night, night + 365.0])
    return (t + rng.uniform(-0.1, 0.1, t.size))[rng.uniform(size=t.size) > 0.3]


def likeliest(curves):
    values = joint_log_likelihood(make_pair(*curves), LAGS, SIGMA, TAU_D, SCALE, RESPONSE)
    return LAGS[np.argmax(values)]


def most_correlated(curves):
    return recover_lag(*curves, LAGS, 0, np.random.default_rng(0)).peak_d


@pytest.mark.parametrize("recovered", [likeliest, most_correlated])
def test_wrong_lags_land_where_lags_are_alike(recovered):
    """More than half of them, on the half of all wrong lags most easily taken for the truth."""
    above, wrong = 0, 0
    for true_d in TRUE_D:
        rng = np.random.default_rng(6)
        t1, t2 = epochs(3.0, rng), epochs(6.0, rng)
        design = make_design(t1, E1, t2, E2, true_d, SIGMA, TAU_D, SCALE, RESPONSE)
        alike = ambiguity(design, LAGS).mistaken
        away = np.abs(LAGS - true_d) > 0.3 * true_d
        for seed in range(150):
            rng = np.random.default_rng((6, seed))
            x, y = draw_pair(rng, t1, t2, TAU_D, true_d, 0.8 * true_d)
            f1 = SIGMA * x + E1 * rng.standard_normal(x.size)
            f2 = SIGMA * SCALE * y + E2 * rng.standard_normal(y.size)
            at = int(np.searchsorted(LAGS, recovered((t1, f1, E1, t2, f2, E2)) - 1e-6))
            if away[at]:
                wrong += 1
                above += alike[at] > np.median(alike[away])
    assert wrong > 50
    assert binomtest(int(above), wrong, 0.5, alternative="greater").pvalue < 1e-3
