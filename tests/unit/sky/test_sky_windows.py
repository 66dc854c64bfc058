"""Windows of targets in ordinary and extreme cases."""

import numpy as np
import pytest

from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.model.sky import NightState
from planner.sky import moon_separation, nights_at, positions_at, sun_moon_at, windows_of

RIDGE_LATITUDE = -30.4


def site_at(latitude, longitude=-70.9, name="here"):
    return Site(
        name,
        latitude,
        longitude,
        2000.0,
        None,
        WeatherClimate((1.0,) * 12, 2.0),
        SkyQuality(1.2, (), ()),
    )


def windows_for(site, ra, dec, limits, first=61000, last=61029):
    nights = nights_at(site, first, last, limits)
    return nights, windows_of(ra, dec, site, nights, limits)


def test_rows_are_sorted_and_shaped_and_typed():
    limits = Limits(2.0, -18.0, 30.0)
    nights, windows = windows_for(site_at(-30.4), [10.0, 100.0, 190.0], [-30.0, 0.0, 20.0], limits)
    assert windows.site == "here"
    assert windows.target.dtype == windows.night.dtype == np.int32
    order = np.lexsort((windows.start_mjd, windows.target))
    np.testing.assert_array_equal(order, np.arange(windows.target.size))
    for column in (windows.start_mjd, windows.airmass_min, windows.moon_illumination):
        assert column.shape == windows.target.shape
        assert column.dtype == np.float64
    assert (windows.start_mjd >= nights.dark_start_mjd[windows.night]).all()
    assert (windows.end_mjd <= nights.dark_end_mjd[windows.night]).all()
    assert (windows.airmass_min >= 1.0).all()
    assert (windows.airmass_min <= 2.0).all()


def test_columns_at_the_best_time_are_those_of_the_sky_then():
    site, limits = site_at(-30.4), Limits(2.0, -18.0, 0.0)
    _, windows = windows_for(site, [100.0], [-10.0], limits)
    there = positions_at(100.0, -10.0, site, windows.best_mjd)
    sky = sun_moon_at(site, windows.best_mjd)
    np.testing.assert_allclose(
        1 / windows.airmass_min, np.sin(np.radians(there.altitude_deg)), atol=3e-6
    )
    np.testing.assert_allclose(windows.moon_altitude_deg, sky.moon_altitude_deg, atol=3e-4)
    np.testing.assert_allclose(windows.moon_illumination, sky.moon_illumination, atol=1e-6)
    separation = moon_separation(100.0, -10.0, site, windows.best_mjd)
    np.testing.assert_allclose(windows.moon_separation_deg, separation, atol=3e-4)
    for moment in (windows.start_mjd, windows.end_mjd):
        other = positions_at(100.0, -10.0, site, moment).altitude_deg
        assert (other <= there.altitude_deg + 1e-3).all()


def test_a_target_that_never_rises_has_no_rows_and_disturbs_no_other():
    limits = Limits(2.0, -18.0, 30.0)
    _, alone = windows_for(site_at(-30.4), [100.0], [-30.0], limits)
    _, both = windows_for(site_at(-30.4), [100.0, 100.0], [75.0, -30.0], limits)
    assert (both.target == 1).all()
    np.testing.assert_array_equal(alone.start_mjd, both.start_mjd)


def test_no_target_at_all_gives_no_rows():
    _, windows = windows_for(site_at(-30.4), [], [], Limits(2.0, -18.0, 30.0))
    assert windows.target.size == windows.start_mjd.size == 0


def test_a_target_that_never_sets_has_the_whole_dark_time():
    nights, windows = windows_for(site_at(-60.0), [100.0], [-70.0], Limits(3.0, -12.0, 0.0))
    dark = np.flatnonzero(nights.state == NightState.ORDINARY)
    np.testing.assert_array_equal(windows.night, dark)
    np.testing.assert_array_equal(windows.start_mjd, nights.dark_start_mjd[dark])
    np.testing.assert_array_equal(windows.end_mjd, nights.dark_end_mjd[dark])


@pytest.mark.parametrize(("latitude", "dec", "seen"), [(45, 90, 1), (45, -90, 0), (-45, -90, 1)])
def test_the_celestial_poles(latitude, dec, seen):
    nights, windows = windows_for(site_at(latitude), [0.0], [dec], Limits(2.0, -12.0, 0.0))
    assert windows.night.size == seen * nights.night.size
    # the pole of 2000 stays within a fifth of a degree of the pole of date
    expected = 1 / np.sin(np.radians(45.0))
    np.testing.assert_allclose(windows.airmass_min, expected, atol=0.01)


@pytest.mark.parametrize("latitude", [-90.0, 90.0])
def test_from_a_pole_targets_keep_their_height(latitude):
    first = 61220 if latitude < 0 else 61020
    nights = nights_at(site_at(latitude), first, first + 9, Limits(2.0, -12.0, 0.0))
    assert (nights.state == NightState.ALWAYS).all()
    sign = np.sign(latitude)
    dec = [sign * 80.0, sign * 30.5, sign * 29.5, -sign * 80.0]
    windows = windows_of([10.0] * 4, dec, site_at(latitude), nights, Limits(2.0, -12.0, 0.0))
    assert np.bincount(windows.target, minlength=4)[[0, 3]].tolist() == [10, 0]
    height = np.degrees(np.arcsin(1 / windows.airmass_min[windows.target == 0]))
    np.testing.assert_allclose(height, 80.0, atol=0.2)


def test_polar_night_holds_two_windows_of_a_target_that_sets():
    """In 24 dark hours a target that culminates at noon is up at the start and at the end."""
    site, limits = site_at(82.0, 0.0), Limits(1.6, -12.0, 0.0)
    nights = nights_at(site, 61030, 61030, limits)
    assert nights.state[0] == NightState.ALWAYS
    noon = nights.noon_mjd[0]
    on_meridian = positions_at(0.0, 31.0, site, noon).hour_angle_deg
    windows = windows_of([on_meridian], [31.0], site, nights, limits)
    assert windows.night.tolist() == [0, 0]
    assert windows.start_mjd[0] == noon
    assert windows.end_mjd[1] == noon + 1.0


def test_the_moon_cuts_windows_at_its_horizon_and_at_its_circle():
    """Every edge that the moon makes lies where it rises or sets, or at the least distance."""
    site, limits = site_at(-30.4), Limits(2.5, -18.0, 40.0)
    nights = nights_at(site, 61000, 62460, limits)
    moonless = windows_of([84.0], [18.0], site, nights, Limits(2.5, -18.0, 0.0))
    windows = windows_of([84.0], [18.0], site, nights, limits)
    is_horizon, is_circle = [], []
    for edges, others in (
        (windows.start_mjd, moonless.start_mjd),
        (windows.end_mjd, moonless.end_mjd),
    ):
        cut = edges[np.isin(edges, others, invert=True)]
        is_horizon.append(np.abs(sun_moon_at(site, cut).moon_altitude_deg) < 1e-3)
        is_circle.append(np.abs(moon_separation(84.0, 18.0, site, cut) - 40.0) < 1e-3)
        assert (is_horizon[-1] | is_circle[-1]).all()
    # the moon rises late in windows and sets early in them, and comes and goes at its circle
    assert sum(map(np.sum, is_horizon)) > 10
    assert sum(map(np.sum, is_circle)) > 5
    lost = (moonless.end_mjd - moonless.start_mjd).sum() - (
        windows.end_mjd - windows.start_mjd
    ).sum()
    assert lost > 0


def test_one_night_may_hold_a_window_on_either_side_of_the_moon():
    """At high latitude the moon can rise and set while a near target stays up."""
    site, limits = site_at(65.0, 20.0), Limits(4.0, -6.0, 85.0)
    nights = nights_at(site, 61020, 61400, limits)
    windows = windows_of([180.0], [60.0], site, nights, limits)
    per_night = np.bincount(windows.night)
    assert per_night.max() == 2
    for night in np.flatnonzero(per_night == 2)[:5]:
        first, second = np.flatnonzero(windows.night == night)
        between = np.linspace(windows.end_mjd[first], windows.start_mjd[second], 12)[1:-1]
        assert (sun_moon_at(site, between).moon_altitude_deg > -1e-3).all()
        assert (moon_separation(180.0, 60.0, site, between) < 85.0 + 1e-3).all()


def test_a_wide_moon_circle_leaves_only_moonless_time():
    site, limits = site_at(-30.4), Limits(2.0, -18.0, 180.0)
    _, windows = windows_for(site, [100.0], [-30.0], limits)
    assert windows.night.size > 10
    middle = 0.5 * (windows.start_mjd + windows.end_mjd)
    assert (sun_moon_at(site, middle).moon_altitude_deg < 0).all()


def test_airmass_limits_of_one_and_of_the_horizon():
    _, nothing = windows_for(site_at(-30.4), [100.0], [-30.0], Limits(1.0, -18.0, 0.0))
    assert nothing.night.size == 0
    site = site_at(-30.4)
    _, horizon = windows_for(site, [100.0], [-30.0], Limits(np.inf, -18.0, 0.0))
    height = positions_at(100.0, -30.0, site, horizon.end_mjd).altitude_deg
    assert height.min() > -1e-3


def test_wrong_arguments_are_refused():
    site, limits = site_at(-30.4), Limits(2.0, -18.0, 30.0)
    nights = nights_at(site, 61000, 61001, limits)
    with pytest.raises(ValueError, match="airmass limit must be at least 1"):
        windows_of([0.0], [0.0], site, nights, Limits(0.9, -18.0, 30.0))
    with pytest.raises(ValueError, match="belong to here, not to there"):
        windows_of([0.0], [0.0], site_at(-30.4, name="there"), nights, limits)
    with pytest.raises(ValueError, match="declination within -90 to 90"):
        windows_of([0.0], [90.1], site, nights, limits)
    with pytest.raises(ValueError, match="must be finite"):
        windows_of([np.nan], [0.0], site, nights, limits)
