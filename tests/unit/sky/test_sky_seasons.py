"""Seasons from hand-made windows."""

import numpy as np

from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.model.sky import Nights, Season, Windows
from planner.sky import nights_at, seasons_of, windows_of


def nights_of(count):
    start = 61000.0 + np.arange(count)
    zeros = np.zeros(count)
    return Nights(
        "here", 61000 + np.arange(count), start, zeros.astype(np.int8), start, start, zeros, zeros
    )


def windows_on(rows):
    """Make windows from (target, night, hours)."""
    target, night, hours = (np.array(column) for column in zip(*rows, strict=True))
    start = 61000.0 + night
    zeros = np.zeros(len(rows))
    return Windows(
        "here",
        target.astype(np.int32),
        night.astype(np.int32),
        start,
        start + hours / 24.0,
        start,
        zeros,
        zeros,
        zeros,
        zeros,
    )


def test_short_interruptions_are_bridged_and_long_ones_end_the_season():
    nights = [*range(5, 10), *range(25, 30), *range(46, 50)]
    windows = windows_on([(0, night, 1.0) for night in nights])
    # 15 nights are missing between 9 and 25, 16 between 29 and 46
    assert seasons_of(windows, nights_of(60)) == [
        Season(0, 5, 29, 10, 16),
        Season(0, 46, 49, 4, 10),
    ]
    assert seasons_of(windows, nights_of(60), bridge_nights=14) == [
        Season(0, 5, 9, 5, 15),
        Season(0, 25, 29, 5, 16),
        Season(0, 46, 49, 4, 10),
    ]


def test_nights_need_enough_hours_in_all_their_windows_together():
    windows = windows_on([(0, 3, 0.9), (0, 4, 0.6), (0, 4, 0.6), (0, 5, 1.3)])
    assert seasons_of(windows, nights_of(10), min_hours=1.0) == [Season(0, 4, 5, 2, 4)]
    assert seasons_of(windows, nights_of(10), min_hours=2.0) == []


def test_targets_keep_their_numbers_and_those_without_windows_have_no_season():
    windows = windows_on([(1, 0, 1.0), (1, 1, 1.0), (4, 7, 1.0)])
    assert seasons_of(windows, nights_of(8)) == [Season(1, 0, 1, 2, 6), Season(4, 7, 7, 1, 0)]


def test_no_windows_no_seasons():
    empty = windows_on([(0, 0, 1.0)])
    none = Windows("here", *(getattr(empty, name)[:0] for name in empty.__slots__[1:]))
    assert seasons_of(none, nights_of(8)) == []


def test_a_target_on_the_ecliptic_has_one_season_a_year_in_spite_of_the_moon():
    site = Site(
        "here",
        -30.4,
        -70.9,
        2300.0,
        None,
        WeatherClimate((1.0,) * 12, 2.0),
        SkyQuality(1.2, (), ()),
    )
    limits = Limits(2.0, -18.0, 60.0)
    nights = nights_at(site, 61000, 61000 + 3 * 365, limits)
    windows = windows_of([180.0], [0.0], site, nights, limits)
    seasons = seasons_of(windows, nights)
    assert len(seasons) in {3, 4}
    assert all(season.gap_after_nights > 60 for season in seasons[:-1])
    assert all(season.nights < season.last - season.first + 1 for season in seasons)
