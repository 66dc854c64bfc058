"""Sun, moon and nights against the general ephemeris library ephem (XEphem's VSOP87 and moon)."""

import ephem
import numpy as np
import pytest

from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.model.sky import NightState
from planner.sky import nights_at, sun_moon_at

AIR = (WeatherClimate((1.0,) * 12, 2.0), SkyQuality(1.2, (), ()))

MJD_OF_EPHEM = 15019.5  # ephem counts days from 1899-12-31 noon


def _site(latitude, longitude):
    return Site("here", latitude, longitude, 0.0, None, *AIR)


def _observer(site):
    there = ephem.Observer()
    there.lat, there.lon = np.radians(site.latitude_deg), np.radians(site.longitude_deg)
    there.elevation, there.pressure = site.elevation_m, 0
    return there


def _sun_altitude(there, mjd):
    there.date = mjd - MJD_OF_EPHEM
    return np.degrees(float(ephem.Sun(there).alt))


def test_sun_moon_and_illumination_agree():
    rng = np.random.default_rng(8)
    for latitude in (-90, -67.5, -30.4, 0, 20, 55, 78.2, 90):
        site = _site(latitude, rng.uniform(-180, 180))
        there = _observer(site)
        mjd = rng.uniform(60000, 66900) + rng.uniform(0, 100, 60)
        ours = sun_moon_at(site, mjd)
        for k, t in enumerate(mjd):
            there.date = t - MJD_OF_EPHEM
            sun, moon = ephem.Sun(there), ephem.Moon(there)
            assert abs(np.degrees(float(sun.alt)) - ours.sun_altitude_deg[k]) < 0.01
            assert abs(np.degrees(float(moon.alt)) - ours.moon_altitude_deg[k]) < 0.01
            # ephem takes the phase where the observer stands, we at the Earth's centre
            assert abs(moon.phase / 100 - ours.moon_illumination[k]) < 0.01


def _extreme(height, left, right):
    """Time of the largest height in [left, right], of which it has one maximum."""
    for _ in range(25):
        a, b = left + (right - left) / 3, right - (right - left) / 3
        left, right = (a, right) if height(a) < height(b) else (left, b)
    return (left + right) / 2


def _crossing(height, below, above):
    for _ in range(22):
        middle = (below + above) / 2
        below, above = (middle, above) if height(middle) < 0 else (below, middle)
    return below


def _night_by_ephem(there, noon, limit):
    """Return state, dusk, dawn, and the sun's lowest and highest height over its limit."""

    def height(mjd):
        return _sun_altitude(there, mjd) - limit

    grid = noon + np.linspace(0, 1, 41)
    sampled = np.array([height(t) for t in grid])

    def turning(k, sign):
        """Return the extreme next to sample k; the sample itself where it settles the matter."""
        if sign * sampled[k] >= 0:
            return grid[k]
        top = _extreme(lambda t: sign * height(t), grid[max(k - 1, 0)], grid[min(k + 1, 40)])
        return top if sign * height(top) > sign * sampled[k] else grid[k]

    lowest = int(np.argmin(sampled))
    low = turning(lowest, -1)
    if height(low) >= 0:
        return NightState.NONE, np.nan, np.nan, height(low), np.inf
    before = turning(int(np.argmax(sampled[: lowest + 1])), +1)
    after = turning(lowest + int(np.argmax(sampled[lowest:])), +1)
    dusk = _crossing(height, low, before) if height(before) >= 0 else noon
    dawn = _crossing(height, low, after) if height(after) >= 0 else noon + 1
    high = max(height(before), height(after))
    return (NightState.ALWAYS if high < 0 else NightState.ORDINARY), dusk, dawn, height(low), high


LATITUDES = (-90, -89.95, -85, -75.1, -66.6, -48.7, -30.4, 0, 20.7, 48.6, 55, 60.6, 66.6, 78.2, 90)


@pytest.mark.parametrize("latitude", LATITUDES)
def test_every_night_of_a_year(latitude):
    """State, dusk and dawn, through polar days, polar nights and grazing dusks."""
    rng = np.random.default_rng(abs(int(latitude * 100)))
    site = _site(latitude, rng.uniform(-180, 180))
    limit = (-18.0, -12.0, -6.0)[LATITUDES.index(latitude) % 3]
    nights = nights_at(site, 61100, 61465, Limits(2.0, limit, 30.0))
    there = _observer(site)
    for k, noon in enumerate(nights.noon_mjd):
        state, dusk, dawn, low, high = _night_by_ephem(there, noon, limit)
        if min(abs(low), abs(high)) > 0.001:  # else the two libraries may fall on either side
            assert nights.state[k] == state, (k, low, high)
        if nights.state[k] == state == NightState.ORDINARY:
            for ours, theirs in ((nights.dark_start_mjd[k], dusk), (nights.dark_end_mjd[k], dawn)):
                # a slow sun makes the time soft; its altitude is then the sharper test
                is_same_time = abs(ours - theirs) * 86400 < 5
                assert is_same_time or abs(_sun_altitude(there, ours) - limit) < 0.001, k
