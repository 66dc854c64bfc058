"""Windows and positions against astropy's full AltAz transformation.

astropy works here with UT1 = UTC and no refraction, as the planner does; everything else of its
transformation (diurnal aberration, light bending, nutation at each instant) is left on.
"""

import dataclasses

import numpy as np
import pytest
from astropy import units as u
from astropy.coordinates import AltAz, EarthLocation, SkyCoord, get_body
from astropy.time import Time

from planner.base.timescale import offline
from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.model.sky import NightState
from planner.sky import moon_separation, nights_at, positions_at, sun_moon_at, windows_of

AIR = (WeatherClimate((1.0,) * 12, 2.0), SkyQuality(1.2, (), ()))

CASES = 240
EDGE_S = 5.0
DAY_S = 86400.0


def _site(latitude, longitude, elevation=2000.0):
    return Site("here", latitude, longitude, elevation, None, *AIR)


class Oracle:
    """astropy's view of one target and the sky from arrays of places and times."""

    def __init__(self, sites, ra, dec, mjd):
        location = EarthLocation.from_geodetic(
            [s.longitude_deg for s in sites] * u.deg,
            [s.latitude_deg for s in sites] * u.deg,
            [s.elevation_m for s in sites] * u.m,
        )
        with offline():
            time = Time(mjd, format="mjd", scale="utc")
            frame = AltAz(obstime=time, location=location, pressure=0 * u.hPa)
            target = SkyCoord(ra * u.deg, dec * u.deg)
            sun, moon = (get_body(body, time, location) for body in ("sun", "moon"))
            self.target = target.transform_to(frame)
            self.altitude = self.target.alt.deg
            self.secz = self.target.secz.value
            self.sun_altitude = sun.transform_to(frame).alt.deg
            self.moon_altitude = moon.transform_to(frame).alt.deg
            self.moon = moon
            self.moon_separation = moon.separation(target).deg

    def allows(self, limits):
        return (
            (self.secz >= 1.0)
            & (self.secz <= limits.airmass)
            & (self.sun_altitude <= limits.sun_altitude_deg)
            & ((self.moon_altitude <= 0) | (self.moon_separation >= limits.moon_separation_deg))
        )


@pytest.fixture(scope="module")
def cases():
    """Random sites from 85 S to 85 N, one target near the sky of each, one night, limits."""
    rng = np.random.default_rng(20270301)
    drawn = []
    for k in range(CASES):
        # a third of the sites at high latitude
        latitude = rng.uniform(-60, 60) if k % 3 else rng.choice([-1, 1]) * rng.uniform(60, 85)
        site = _site(latitude, rng.uniform(-180, 180), rng.uniform(0, 4500))
        limits = Limits(
            rng.uniform(1.3, 3.0), float(rng.choice([-6.0, -12.0, -18.0])), rng.uniform(20, 70)
        )
        night = int(rng.integers(61000, 63500))
        dec = np.clip(latitude + rng.uniform(-55, 55), -90, 90)
        nights = nights_at(site, night, night, limits)
        ra = rng.uniform(0, 360)
        drawn.append((site, limits, nights, ra, dec, windows_of([ra], [dec], site, nights, limits)))
    return drawn


def test_the_cases_cover_what_they_should(cases):
    windows = sum(w.night.size for *_, w in cases)
    assert windows > 150
    assert sum(site.latitude_deg > 60 for site, *_ in cases) > 20
    assert sum(site.latitude_deg < -60 for site, *_ in cases) > 20
    assert sum(nights.state[0] == NightState.ALWAYS for _, _, nights, *_ in cases) > 3
    assert sum(nights.state[0] == NightState.NONE for _, _, nights, *_ in cases) > 10
    moon_cut = [w.night.size > 1 or w.moon_separation_deg.min(initial=180) < 70 for *_, w in cases]
    assert sum(moon_cut) > 30


def test_altitudes_of_targets_sun_and_moon_agree_within_a_hundredth_of_a_degree():
    rng = np.random.default_rng(5)
    count = 400
    sites = [
        _site(b, r)
        for b, r in zip(rng.uniform(-90, 90, count), rng.uniform(-180, 180, count), strict=True)
    ]
    ra, dec = rng.uniform(0, 360, count), np.degrees(np.arcsin(rng.uniform(-1, 1, count)))
    mjd = rng.uniform(60000, 67000, count)
    oracle = Oracle(sites, ra, dec, mjd)
    ours = [positions_at(*row) for row in zip(ra, dec, sites, mjd, strict=True)]
    sky = [sun_moon_at(*row) for row in zip(sites, mjd, strict=True)]
    # far inside the 0.01 degree that a plan needs: diurnal aberration alone is 0.32 arcsec
    limit = 0.5 / 3600
    assert np.abs(np.array([p.altitude_deg for p in ours]) - oracle.altitude).max() < limit
    turn = (np.array([p.azimuth_deg for p in ours]) - oracle.target.az.deg + 180) % 360 - 180
    assert np.abs(turn * np.cos(np.radians(oracle.altitude))).max() < limit
    sun, moon = (np.array(column) for column in list(zip(*sky, strict=True))[:2])
    assert np.abs(sun - oracle.sun_altitude).max() < 2 * limit
    assert np.abs(moon - oracle.moon_altitude).max() < 4 * limit


def test_the_moon_stands_where_astropy_puts_it():
    rng = np.random.default_rng(6)
    count = 100
    site = _site(-30.4, -70.9)
    ra, dec = rng.uniform(0, 360, count), np.degrees(np.arcsin(rng.uniform(-1, 1, count)))
    mjd = rng.uniform(60000, 67000, count)
    oracle = Oracle([site] * count, ra, dec, mjd)
    sky = sun_moon_at(site, mjd)
    ours = SkyCoord(sky.moon_ra_deg * u.deg, sky.moon_dec_deg * u.deg)
    theirs = SkyCoord(oracle.moon.ra, oracle.moon.dec)
    assert ours.separation(theirs).arcsec.max() < 2.0
    np.testing.assert_allclose(
        moon_separation(ra, dec, site, mjd), oracle.moon_separation, atol=2.0 / 3600
    )


def test_window_edges_lie_within_five_seconds(cases):
    """Just inside each edge astropy allows the target, just outside it does not."""
    rows = []
    for site, limits, nights, ra, dec, windows in cases:
        noon = nights.noon_mjd[0]
        for start, end in zip(windows.start_mjd, windows.end_mjd, strict=True):
            # an edge at noon is the night's own, no limit of the sky
            if start > noon:
                rows.append((site, limits, ra, dec, start, +1))
            if end < noon + 1.0:
                rows.append((site, limits, ra, dec, end, -1))
    sites, limits, ra, dec, edge, inward = zip(*rows, strict=True)
    assert len(rows) > 300
    step = np.array(inward) * EDGE_S / DAY_S
    each = Limits(*np.array([dataclasses.astuple(limit) for limit in limits]).T)
    inside = Oracle(sites, np.array(ra), np.array(dec), np.array(edge) + step)
    outside = Oracle(sites, np.array(ra), np.array(dec), np.array(edge) - step)
    assert inside.allows(each).all()
    assert not outside.allows(each).any()


def test_no_window_is_missing_and_none_is_too_long(cases):
    """All through the dark time, astropy allows the target exactly inside our windows."""
    samples = 30
    kept = [case for case in cases if case[2].state[0] != NightState.NONE]
    for chunk in np.array_split(np.arange(len(kept)), 4):
        sites, each, ra, dec, mjd, ours, close = [], [], [], [], [], [], []
        for site, limits, nights, a, d, windows in (kept[k] for k in chunk):
            t = np.linspace(nights.dark_start_mjd[0], nights.dark_end_mjd[0], samples + 2)[1:-1]
            edges = np.concatenate([windows.start_mjd, windows.end_mjd, [0.0]])
            spans = zip(windows.start_mjd, windows.end_mjd, strict=True)
            sites += [site] * samples
            each += [dataclasses.astuple(limits)] * samples
            ra += [a] * samples
            dec += [d] * samples
            mjd.append(t)
            ours.append(np.any([(t >= s) & (t <= e) for s, e in spans], axis=0) & (t > 0))
            # the rule drops windows of less than a minute and grants five seconds an edge
            close.append(np.abs(t[:, None] - edges).min(axis=1) * DAY_S < EDGE_S)
        oracle = Oracle(sites, np.array(ra), np.array(dec), np.concatenate(mjd))
        agree = oracle.allows(Limits(*np.array(each).T)) == np.concatenate(ours)
        assert (agree | np.concatenate(close)).all()
