"""Positions of targets, sun and moon."""

import numpy as np
import pytest

from planner.model.observatory import Site, SkyQuality, WeatherClimate
from planner.sky import airmass_of, moon_separation, positions_at, sun_moon_at


def site_at(latitude, longitude=0.0):
    return Site(
        "here",
        latitude,
        longitude,
        0.0,
        None,
        WeatherClimate((1.0,) * 12, 2.0),
        SkyQuality(1.2, (), ()),
    )


def at_hour_angle(site, dec, hours):
    """Positions of a target at the given hour angles of date, dec of date nearly `dec`."""
    mjd = 61000.0
    meridian = positions_at(0.0, dec, site, mjd).hour_angle_deg
    return positions_at(meridian - 15.0 * np.asarray(hours), dec, site, mjd)


@pytest.mark.parametrize(
    ("dec", "hours", "angle", "altitude"),
    [(62.0, 2.0, 133.3, None), (25.14, 2.0, 68.5, 62.9), (25.14, 4.0, 67.9, 37.5)],
)
def test_parallactic_angle(dec, hours, angle, altitude):
    """Own evaluation of tan q = sin H / (tan phi cos delta - sin delta cos H) at 31.96 N.

    The sine form would give 46.7 instead of 133.3 degrees. Precession since 2000 moves
    coordinates by up to 0.3 degrees.
    """
    site = site_at(31.96)
    for sign in (1, -1):
        there = at_hour_angle(site, dec, sign * hours)
        assert there.hour_angle_deg == pytest.approx(sign * 15 * hours, abs=0.3)
        assert there.parallactic_angle_deg == pytest.approx(sign * angle, abs=0.6)
        if altitude is not None:
            assert there.altitude_deg == pytest.approx(altitude, abs=0.3)


def test_parallactic_angle_is_the_direction_to_the_zenith():
    """Moving from the target along the angle leads to the zenith: by vectors, anywhere."""
    rng = np.random.default_rng(4)
    for _ in range(30):
        site = site_at(rng.uniform(-89, 89), rng.uniform(-180, 180))
        ra, dec, mjd = rng.uniform(0, 360), rng.uniform(-80, 80), rng.uniform(61000, 67000)
        there = positions_at(ra, dec, site, mjd)
        step = 0.01
        q = np.radians(there.parallactic_angle_deg)
        moved = positions_at(
            ra + step * np.sin(q) / np.cos(np.radians(dec)), dec + step * np.cos(q), site, mjd
        )
        # north of 2000 and north of date differ by up to 0.1 degrees / cos(dec)
        gain = (moved.altitude_deg - there.altitude_deg) / step
        assert gain == pytest.approx(1.0, abs=1e-3)


def test_azimuth_runs_from_north_through_east():
    site = site_at(-30.0)
    north = at_hour_angle(site, 50.0, 0.0).azimuth_deg
    assert (north + 180.0) % 360.0 == pytest.approx(180.0, abs=0.3)
    assert at_hour_angle(site, -60.0, 0.0).azimuth_deg == pytest.approx(180.0, abs=0.3)
    assert at_hour_angle(site, 0.0, -6.0).azimuth_deg == pytest.approx(90.0, abs=0.3)
    assert at_hour_angle(site, 0.0, 6.0).azimuth_deg == pytest.approx(270.0, abs=0.3)


def test_shapes_broadcast():
    site = site_at(10.0)
    mjd = np.linspace(61000, 61010, 7)
    ra, dec = np.array([0.0, 90.0, 180.0]), np.array([-90.0, 0.0, 90.0])
    table = positions_at(ra[:, None], dec[:, None], site, mjd)
    for column in table:
        assert np.shape(column) == (3, 7)
    assert moon_separation(ra[:, None], dec[:, None], site, mjd).shape == (3, 7)
    assert all(np.shape(column) == (7,) for column in sun_moon_at(site, mjd))
    assert all(np.shape(column) == () for column in positions_at(10.0, 10.0, site, 61000.0))
    one = positions_at(90.0, 0.0, site, mjd[3])
    assert one.altitude_deg == pytest.approx(table.altitude_deg[1, 3], abs=1e-7)
    assert positions_at([], [], site, []).altitude_deg.shape == (0,)


def test_airmass_is_sec_z_and_infinite_below_the_horizon():
    given = airmass_of([90.0, 30.0, 0.0, -10.0])
    np.testing.assert_allclose(given, [1.0, 2.0, np.inf, np.inf], rtol=1e-12)
    assert airmass_of(45.0) == pytest.approx(np.sqrt(2.0))


def test_the_sun_at_a_solstice_noon_and_an_equinox_pole():
    """Obliquity 23.44 degrees: noon altitude 90 - 23.44 - 20 degrees at 20 S in June."""
    site = site_at(-20.0)
    around_noon = np.linspace(61577.4, 61577.6, 400)  # 2027-06-21
    assert sun_moon_at(site, around_noon).sun_altitude_deg.max() == pytest.approx(46.56, abs=0.01)
    # equinox of 2027-03-20 at 20:25 UTC (from memory)
    assert sun_moon_at(site_at(90.0), 61484.851).sun_altitude_deg == pytest.approx(0.0, abs=0.01)


def test_the_moon_is_where_it_says():
    """The distance from the moon's own coordinates is zero but for aberration."""
    site, mjd = site_at(-30.4, -70.9), np.linspace(61000, 61028, 9)
    sky = sun_moon_at(site, mjd)
    distance = moon_separation(sky.moon_ra_deg, sky.moon_dec_deg, site, mjd)
    assert distance.max() < 21.0 / 3600.0
    opposite = moon_separation(sky.moon_ra_deg + 180.0, -sky.moon_dec_deg, site, mjd)
    assert opposite.min() > 180.0 - 21.0 / 3600.0


def test_eclipse_of_the_sun_at_its_place():
    """2027-08-02: sun and moon meet over Luxor at about 10:05 UTC (from memory)."""
    site = site_at(25.7, 32.6)
    sky = sun_moon_at(site, 61619.0 + (10 + 5 / 60) / 24)
    assert abs(sky.sun_altitude_deg - sky.moon_altitude_deg) < 0.1
    assert sky.moon_illumination < 1e-3
