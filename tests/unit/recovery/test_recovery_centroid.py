import numpy as np
import pytest

from planner.recovery import centroid

LAGS = np.arange(-2.0, 6.0)
NAN = np.nan


def test_centroid_over_the_stretch_above_four_fifths_of_the_peak():
    r = np.array([0.1, 0.79, 0.85, 1.0, 0.8, 0.7, 0.95, 0.2])
    where, r_max, peak, at_edge = centroid(LAGS, r)
    assert where == pytest.approx((0.85 * 0 + 1.0 * 1 + 0.8 * 2) / (0.85 + 1.0 + 0.8))
    assert (r_max, peak, at_edge) == (1.0, 1.0, False)


def test_a_lower_threshold_takes_in_more():
    r = np.array([0.1, 0.6, 0.9, 1.0, 0.4, 0.1, 0.1, 0.1])
    assert centroid(LAGS, r, 0.5)[0] == pytest.approx((-0.6 + 1.0) / 2.5)


def test_undefined_lags_end_the_stretch():
    r = np.array([0.9, NAN, 0.9, 1.0, 0.9, NAN, 0.9, 0.9])
    assert centroid(LAGS, r)[0] == pytest.approx(1.0)


@pytest.mark.parametrize(
    "r",
    [
        [1.0, 0.9, 0.8, 0.1, 0.1, 0.1, 0.1, 0.1],
        [0.1, 0.1, 0.1, 0.1, 0.1, 0.8, 0.9, 1.0],
        [NAN, NAN, 1.0, 0.9, 0.5, 0.2, 0.1, 0.1],
        [0.1, 0.1, 0.5, 0.9, 1.0, NAN, 0.1, 0.1],
    ],
)
def test_peak_at_the_end_of_what_was_searched_is_no_lag(r):
    where, r_max, _, at_edge = centroid(LAGS, r)
    assert np.isnan(where)
    assert r_max == 1.0
    assert at_edge


def test_no_positive_or_no_defined_correlation_is_no_lag():
    where, r_max, peak, at_edge = centroid(LAGS, -np.abs(LAGS - 1.0) - 0.1)
    assert np.isnan(where)
    assert (r_max, peak, at_edge) == (-0.1, 1.0, False)
    for r in (np.full(8, NAN), np.empty(0)):
        found = centroid(LAGS[: r.size], r)
        assert np.all(np.isnan(found[:3]))
        assert not found[3]
