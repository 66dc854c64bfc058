import numpy as np

from planner.recovery.curve import tidy_pair


def test_epochs_are_sorted_and_those_at_one_time_averaged():
    one, two = tidy_pair([5.0, 1.0, 5.0], [2.0, 7.0, 4.0], [0.3, 0.1, 0.4], [4.0], [1.0], 0.2)
    assert one.t_d.tolist() == [0.0, 4.0]
    assert one.flux.tolist() == [7.0, 3.0]
    np.testing.assert_allclose(one.error, [0.1, 0.25])
    assert (two.t_d.tolist(), two.error.tolist()) == ([3.0], [0.2])


def test_unusable_epochs_are_left_out():
    bad = [np.nan, 2.0, 3.0, 4.0, 5.0]
    one, two = tidy_pair(
        bad, [1.0, np.inf, 1.0, 1.0, 9.0], [0.1, 0.1, -0.1, np.nan, 0.0], bad[:1], [1.0], 0.1
    )
    assert one.t_d.tolist() == [0.0]
    assert one.flux.tolist() == [9.0]
    assert two.t_d.size == 0


def test_one_error_for_all_epochs_and_what_was_given_stays_as_it_is():
    t, flux = np.arange(5.0), np.arange(5.0)
    one, _ = tidy_pair(t, flux, 0.3, t, flux, 0.0)
    assert one.error.tolist() == [0.3] * 5
    one.flux[0], one.error[0] = 9.0, 9.0
    assert flux[0] == 0.0
    assert one.error[1] == 0.3
