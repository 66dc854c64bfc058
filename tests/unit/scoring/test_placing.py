from dataclasses import replace

import numpy as np

from planner.model.campaign import Layout
from planner.model.sky import Season
from planner.scoring import place, place_in


def spans(placing):
    return list(zip(placing.first.tolist(), placing.last.tolist(), strict=True))


def test_the_middle_of_an_even_season_is_taken(nights):
    placing = place(Layout(3, 1, 60, 1), [Season(0, 0, 179, 180, 0)], nights(180))
    assert spans(placing) == [(60, 119)]
    assert placing.note == ""


def test_the_stretch_with_the_most_hours_is_taken(nights):
    """No windows before night 100: the stretch must lie after it."""
    placing = place(
        Layout(3, 1, 60, 1), [Season(0, 0, 179, 80, 0)], nights(180, keep=slice(100, None))
    )
    ((first, last),) = spans(placing)
    assert first >= 100
    assert last == first + 59


def test_two_seasons_are_the_fullest_consecutive_ones(nights):
    seasons = [Season(0, 0, 20, 21, 100), Season(0, 121, 300, 180, 60), Season(0, 361, 540, 180, 0)]
    placing = place(Layout(3, 1, 90, 2), seasons, nights(541))
    assert [first >= 121 for first, _ in spans(placing)] == [True, True]


def test_a_short_season_is_used_whole_and_said(nights):
    placing = place(Layout(3, 1, 120, 1), [Season(0, 5, 60, 56, 0)], nights(100))
    assert spans(placing) == [(5, 60)]
    assert placing.note == "season is 56 d"


def test_too_few_seasons_are_said(nights):
    placing = place(Layout(3, 1, 120, 2), [Season(0, 5, 60, 56, 0)], nights(100))
    assert placing.first.size == 0
    assert placing.note == "the campaign holds one season of this target"


def test_a_target_that_is_never_up_is_said(prospect, nights):
    never = replace(prospect, line=(nights(0),), seasons=(), note="never observable")
    placing = place_in(never, Layout(3, 1, 120, 1))
    assert placing.first.size == 0
    assert placing.note == "never observable"


def test_a_target_in_reach_all_year_has_a_season_a_year(nights):
    placing = place(Layout(3, 1, 90, 2), [Season(0, 0, 729, 730, 0)], nights(730))
    (a, b), (c, d) = spans(placing)
    assert (b - a, d - c) == (89, 89)
    assert np.abs((c - a) - 365) <= 1
