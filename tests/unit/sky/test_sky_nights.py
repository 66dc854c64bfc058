"""Nights at ordinary and extreme places."""

import numpy as np
import pytest

from planner.base.timescale import night_of_date, utc_text
from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.model.sky import NightState
from planner.sky import nights_at, sun_moon_at

ASTRONOMICAL = Limits(2.0, -18.0, 30.0)


def site_at(latitude, longitude, elevation=0.0):
    return Site(
        "here",
        latitude,
        longitude,
        elevation,
        None,
        WeatherClimate((1.0,) * 12, 2.0),
        SkyQuality(1.2, (), ()),
    )


def nights_between(site, first, last, limits=ASTRONOMICAL):
    return nights_at(site, night_of_date(first), night_of_date(last), limits)


def test_an_ordinary_night_crosses_midnight_and_the_years_end():
    nights = nights_between(site_at(-30.4, -70.9, 2300.0), "2027-12-30", "2028-01-02")
    assert nights.night.tolist() == [61769, 61770, 61771, 61772]
    assert (nights.state == NightState.ORDINARY).all()
    assert utc_text(nights.dark_start_mjd)[1][:13] == "2028-01-01T01"
    assert (np.diff(nights.dark_start_mjd) > 0.99).all()
    assert (nights.dark_start_mjd > nights.noon_mjd).all()
    assert (nights.dark_end_mjd < nights.noon_mjd + 1).all()
    sun = sun_moon_at(site_at(-30.4, -70.9, 2300.0), nights.dark_start_mjd).sun_altitude_deg
    np.testing.assert_allclose(sun, -18.0, atol=1e-4)


def test_the_night_is_named_by_its_evening_on_both_sides_of_the_date_line():
    """Local noon of the named date opens the night, whatever the UTC date is then."""
    for longitude, noon in ((-180.0, 61001.0), (-179.9, 61000.5 + 179.9 / 360), (180.0, 61000.0)):
        nights = nights_at(site_at(10.0, longitude), 61000, 61000, ASTRONOMICAL)
        assert nights.noon_mjd[0] == pytest.approx(noon, abs=1e-12)
        middle = (nights.dark_start_mjd + nights.dark_end_mjd)[0] / 2
        assert middle == pytest.approx(noon + 0.5, abs=0.02)


def test_two_sides_of_the_date_line_see_the_same_night_a_day_apart_in_name():
    west = nights_at(site_at(10.0, -180.0), 61000, 61000, ASTRONOMICAL)
    east = nights_at(site_at(10.0, 180.0), 61001, 61001, ASTRONOMICAL)
    assert west.dark_start_mjd[0] == pytest.approx(east.dark_start_mjd[0], abs=1e-9)


def test_polar_summer_has_no_nights_and_polar_winter_no_days():
    limits = Limits(2.0, -12.0, 30.0)
    nights = nights_between(site_at(80.0, 15.0), "2027-03-01", "2028-02-29", limits)
    summer = slice(80, 140)
    winter = slice(night_of_date("2027-12-15") - nights.night[0], None)
    assert (nights.state[summer] == NightState.NONE).all()
    assert np.isnan(nights.dark_start_mjd[summer]).all()
    assert np.isnan(nights.dark_end_mjd[summer]).all()
    assert (nights.moon_up_fraction[summer] == 0.0).all()
    assert (nights.state[winter][:15] == NightState.ALWAYS).all()
    always = nights.state == NightState.ALWAYS
    np.testing.assert_array_equal(nights.dark_start_mjd[always], nights.noon_mjd[always])
    np.testing.assert_array_equal(nights.dark_end_mjd[always], nights.noon_mjd[always] + 1.0)


@pytest.mark.parametrize("latitude", [-90.0, 90.0])
def test_a_pole_has_one_long_night(latitude):
    nights = nights_between(site_at(latitude, 0.0), "2027-01-01", "2028-12-31")
    changes = np.flatnonzero(np.diff(nights.state != NightState.NONE))
    assert changes.size == 4
    # at the pole the night begins and ends once a year, cut by noon
    ordinary = np.flatnonzero(nights.state == NightState.ORDINARY)
    assert 2 <= ordinary.size <= 4
    at_noon = (nights.dark_start_mjd == nights.noon_mjd) | (
        nights.dark_end_mjd == nights.noon_mjd + 1.0
    )
    assert at_noon[ordinary].all()


def test_of_two_dark_pieces_the_one_with_the_lowest_sun_is_taken():
    """Mean noon is not the sun's: before polar night it may open just dark, then dawn once more."""
    site, limits = site_at(76.0, 0.0), Limits(2.0, -6.0, 30.0)
    found = 0
    for first in range(61000, 64000, 1000):
        nights = nights_at(site, first, first + 999, limits)
        for k in np.flatnonzero(nights.state == NightState.ORDINARY):
            times = np.linspace(nights.noon_mjd[k], nights.noon_mjd[k] + 1.0, 1441)
            if nights.dark_end_mjd[k] - nights.dark_start_mjd[k] < 0.93:
                continue
            altitude = sun_moon_at(site, times).sun_altitude_deg
            is_dark = altitude < -6.0
            pieces = np.count_nonzero(np.diff(np.concatenate([[0], is_dark, [0]])) == 1)
            found += pieces > 1
            lowest = times[np.argmin(altitude)]
            assert nights.dark_start_mjd[k] <= lowest <= nights.dark_end_mjd[k]
            inside = (times > nights.dark_start_mjd[k]) & (times < nights.dark_end_mjd[k])
            assert is_dark[inside].all()
    assert found >= 1


def test_a_night_of_minutes_is_found():
    """The shortest nights at 48.58 N, where the sun just passes the limit around the solstice."""
    site = site_at(48.58, 3.1)
    nights = nights_between(site, "2027-06-01", "2027-07-12")
    lowest = [
        sun_moon_at(site, np.linspace(noon + 0.3, noon + 0.7, 2000)).sun_altitude_deg.min()
        for noon in nights.noon_mjd
    ]
    is_night = np.array(lowest) < -18.0
    assert 0 < is_night.sum() < is_night.size
    np.testing.assert_array_equal(nights.state == NightState.ORDINARY, is_night)
    hours = 24 * (nights.dark_end_mjd - nights.dark_start_mjd)
    assert np.nanmin(hours) < 0.75


def test_moon_numbers_of_a_new_and_a_full_moon():
    """New moon 2027-08-02 and full moon 2027-08-17, both with an eclipse: from memory."""
    nights = nights_between(site_at(-30.4, -70.9), "2027-08-01", "2027-08-18")
    assert nights.moon_illumination[[0, 1]].max() < 0.02
    assert nights.moon_up_fraction[[0, 1]].max() < 0.05
    assert nights.moon_illumination[[15, 16]].min() > 0.98
    assert nights.moon_up_fraction[[15, 16]].min() > 0.9


def test_share_of_the_night_with_moon_matches_a_count():
    site = site_at(37.2, -2.5)
    nights = nights_at(site, 61000, 61029, ASTRONOMICAL)
    for k in range(30):
        times = np.linspace(nights.dark_start_mjd[k], nights.dark_end_mjd[k], 4001)
        share = (sun_moon_at(site, times).moon_altitude_deg > 0).mean()
        assert nights.moon_up_fraction[k] == pytest.approx(share, abs=1e-3)


def test_decades_ahead_without_a_warning():
    nights = nights_between(site_at(-30.4, -70.9), "2044-12-25", "2045-01-05")
    assert (nights.state == NightState.ORDINARY).all()


def test_reversed_nights_are_refused():
    with pytest.raises(ValueError, match="last night must not lie before the first"):
        nights_at(site_at(0.0, 0.0), 61001, 61000, ASTRONOMICAL)
