import pytest

from planner.recovery import lag_grid, minimum_overlap, search_range


def test_range_leaves_room_for_the_width_of_the_correlation_function():
    assert search_range(600.0, 50.0, 80.0) == (-40.0, 90.0)


def test_range_ends_at_two_thirds_of_the_duration():
    assert search_range(120.0, 300.0, 400.0) == (-80.0, 80.0)


def test_grid_resolves_a_quarter_of_the_sampling_where_it_can():
    lags = lag_grid(-20.0, 40.0, 4.0)
    assert lags[1] - lags[0] == pytest.approx(1.0)
    assert lags[[0, -1]].tolist() == [-20.0, 40.0]


def test_grid_has_at_most_241_points_and_at_least_25():
    assert lag_grid(-200.0, 400.0, 1.0).size == 241
    assert lag_grid(-200.0, 400.0, 1.0, points=100).size == 100
    assert lag_grid(-1.0, 2.0, 5.0).size == 25


def test_overlap_is_a_fifth_of_the_epochs_but_never_under_five():
    assert [minimum_overlap(n) for n in (0, 10, 25, 40, 200)] == [5, 5, 5, 8, 40]
