import numpy as np
import pytest

from planner.recovery import lag_grid, minimum_overlap, search_grid, search_range


def test_range_ends_at_two_thirds_of_the_duration_or_the_longest_lag_to_expect():
    assert search_range(120.0, 300.0) == (-40.0, 80.0)
    assert search_range(120.0, 50.0) == (-25.0, 50.0)


def test_grid_resolves_a_quarter_of_the_sampling_where_it_can():
    lags = lag_grid(-20.0, 40.0, 4.0)
    assert lags[1] - lags[0] == pytest.approx(1.0)
    assert 0.0 in lags
    assert lags[[0, -1]].tolist() == [-20.0, 40.0]


def test_grid_has_at_most_241_points_and_at_least_25():
    assert lag_grid(-200.0, 400.0, 1.0).size == 241
    assert lag_grid(-200.0, 400.0, 1.0, points=100).size == 100
    assert lag_grid(-1.0, 2.0, 5.0).size == 25
    assert np.min(np.abs(lag_grid(-200.0, 400.0, 1.0))) < 1e-12


def test_search_reaches_three_times_the_scatter_above_the_expected_lag():
    assert search_grid(1000.0, 20.0, 0.2)[-1] == pytest.approx(20.0 * 10**0.6)
    assert search_grid(30.0, 20.0, 0.2)[-1] == pytest.approx(20.0)


def test_overlap_is_a_fifth_of_the_epochs_but_never_under_five():
    assert [minimum_overlap(n) for n in (0, 10, 25, 40, 200)] == [5, 5, 5, 8, 40]
