"""Windows against astroplan's constraints and twilights (default accuracy: about a minute)."""

import numpy as np
import pytest
from astroplan import TargetAlwaysUpWarning
from astropy import units as u
from astropy.coordinates import SkyCoord
from astropy.time import Time

from planner.base.timescale import offline
from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.model.sky import NightState
from planner.sky import constraints, nights_at, observer, windows_of

AIR = (WeatherClimate((1.0,) * 12, 2.0), SkyQuality(1.2, (), ()))

LATITUDES = (-80.0, -62.0, -45.2, -30.4, -12.1, 0.5, 19.8, 37.0, 51.5, 69.6, 78.2)
TARGETS_PER_SITE = 22
EDGE_D = 60.0 / 86400.0


def _site(latitude, longitude):
    return Site("here", latitude, longitude, 1500.0, None, *AIR)


def _allows(site, limits, coordinates, mjd):
    """Tell where astroplan's constraints hold; a moon below the horizon disturbs nobody."""
    with offline():
        times = Time(mjd, format="mjd")
        airmass, night, moon = (
            rule.compute_constraint(times, observer(site), coordinates)
            for rule in constraints(limits)
        )
        moon_is_down = observer(site).moon_altaz(times).alt.deg <= 0.0
    return np.asarray(airmass & night & (moon | moon_is_down))


@pytest.mark.parametrize("latitude", LATITUDES)
def test_windows_agree_within_a_minute(latitude):
    """One random target a night for 22 nights through a year at each of eleven sites."""
    rng = np.random.default_rng(int(latitude * 10) + 1000)
    site = _site(latitude, rng.uniform(-180, 180))
    limits = Limits(rng.uniform(1.5, 2.5), -12.0, rng.uniform(30, 60))
    mjd, ours, ra, dec = [], [], [], []
    for night in 61041 + np.linspace(0, 360, TARGETS_PER_SITE).astype(int):
        nights = nights_at(site, night, night, limits)
        a, d = rng.uniform(0, 360), np.clip(latitude + rng.uniform(-50, 50), -90, 90)
        windows = windows_of([a], [d], site, nights, limits)
        edges = np.concatenate([windows.start_mjd, windows.end_mjd])
        # both sides of every edge, and random times of the whole day, those near an edge left out
        free = nights.noon_mjd[0] + rng.uniform(0, 1, 20)
        near = np.abs(free[:, None] - np.append(edges, 0.0)).min(axis=1) < EDGE_D
        times = np.concatenate([edges - EDGE_D, edges + EDGE_D, free[~near]])
        # an edge at noon is the night's own, no limit of the sky
        times = times[np.abs(times - nights.noon_mjd[0] - 0.5) < 0.5 - EDGE_D]
        spans = list(zip(windows.start_mjd, windows.end_mjd, strict=True))
        mjd += list(times)
        ours += [any(start <= t <= end for start, end in spans) for t in times]
        ra += [a] * times.size
        dec += [d] * times.size
    theirs = _allows(site, limits, SkyCoord(ra * u.deg, dec * u.deg), mjd)
    assert 20 < sum(ours) < len(ours) - 20
    np.testing.assert_array_equal(theirs, ours)


def test_twilights_agree_within_a_minute():
    limits = Limits(2.0, -18.0, 30.0)
    for latitude in (-30.4, 52.0):
        site = _site(latitude, 10.0)
        nights = nights_at(site, 61041, 61400, limits)
        for k in range(0, 360, 40):
            with offline():
                midnight = Time(nights.noon_mjd[k] + 0.5, format="mjd")
                there = observer(site)
                if nights.state[k] == NightState.ORDINARY:
                    dusk = there.twilight_evening_astronomical(midnight, which="previous")
                    dawn = there.twilight_morning_astronomical(midnight, which="next")
                    assert abs(dusk.mjd - nights.dark_start_mjd[k]) < EDGE_D
                    assert abs(dawn.mjd - nights.dark_end_mjd[k]) < EDGE_D
                else:
                    with pytest.warns(TargetAlwaysUpWarning):
                        dusk = there.twilight_evening_astronomical(midnight, which="previous")
                    assert np.ma.is_masked(dusk.mjd)
                    seen_none = True
    assert seen_none


def test_each_call_gives_a_new_observer_without_refraction():
    site = _site(-30.4, -70.9)
    first, second = observer(site), observer(site)
    assert first is not second
    assert first.pressure == 0 * u.hPa
    assert abs(first.location.lat.deg - site.latitude_deg) < 1e-9
    assert abs(first.location.lon.deg - site.longitude_deg) < 1e-9
    assert abs(first.location.height.to_value(u.m) - site.elevation_m) < 1e-6
