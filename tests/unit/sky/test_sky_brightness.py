import numpy as np
import pytest

from planner.base.bands import BANDS
from planner.model.observatory import Site, SkyQuality, WeatherClimate
from planner.sky import (
    brightness,
    dark_ab_mag_at,
    extinction_at,
    moon_separation,
    positions_at,
    sky_ab_mag,
    sky_at,
    sun_moon_at,
)

QUALITY = SkyQuality(
    1.2,
    (("V", 21.8), ("u", 22.9), ("B", 22.7), ("R", 20.9), ("i", 20.3)),
    (("u", 0.5), ("i", 0.06), ("V", 0.13), ("B", 0.25), ("R", 0.09)),
)
SITE = Site("Ridge", -30.4, -70.9, 2300.0, None, WeatherClimate((1.0,) * 12, 2.0), QUALITY)


def test_values_at_bands_between_and_beyond():
    assert extinction_at(QUALITY, BANDS["V"].pivot_a) == 0.13
    assert dark_ab_mag_at(QUALITY, BANDS["B"].pivot_a) == pytest.approx(22.7 - 0.09)
    middle = (BANDS["B"].pivot_a + BANDS["V"].pivot_a) / 2
    assert extinction_at(QUALITY, middle) == pytest.approx((0.25 + 0.13) / 2)
    assert dark_ab_mag_at(QUALITY, middle) == pytest.approx((22.61 + 21.82) / 2)
    assert extinction_at(QUALITY, 3000.0) == 0.5
    assert dark_ab_mag_at(QUALITY, 9900.0) == 20.3
    assert isinstance(extinction_at(QUALITY, 5000.0), float)
    both = extinction_at(QUALITY, np.array([3000.0, middle]))
    np.testing.assert_allclose(both, [0.5, 0.19])


def test_a_moon_below_the_horizon_gives_no_light():
    dark = sky_ab_mag(QUALITY, 5478.0, 90.0, -0.1, 1.0, 60.0)
    assert dark == pytest.approx(21.82, abs=1e-9)
    assert sky_ab_mag(QUALITY, 5478.0, 90.0, 0.1, 1.0, 60.0) < dark


def test_moonlight_grows_with_phase_and_towards_the_moon():
    lit = sky_ab_mag(QUALITY, 5478.0, 60.0, 40.0, np.linspace(0, 1, 201), 60.0)
    assert np.all(np.diff(lit) < 0)
    near = sky_ab_mag(QUALITY, 5478.0, 60.0, 40.0, 0.8, np.array([0.1, 0.2, 1.0, 5.0, 9.9, 60.0]))
    assert near[0] == near[1]
    assert np.all(np.diff(near[1:]) > 0)


def test_full_moon_by_band_as_documented():
    """The brightening that the docstring of `sky_ab_mag` states, to its last digit."""
    for band, expected in {"u": 2.8, "B": 3.7, "V": 3.2, "R": 2.7, "i": 1.9}.items():
        pivot = BANDS[band].pivot_a
        dark = sky_ab_mag(QUALITY, pivot, 70.0, -5.0, 1.0, 60.0)
        full = sky_ab_mag(QUALITY, pivot, 70.0, 30.0, 1.0, 60.0)
        assert dark - full == pytest.approx(expected, abs=0.051)
        day_off = sky_ab_mag(QUALITY, pivot, 70.0, 30.0, 0.99, 60.0)
        assert day_off - full == pytest.approx(0.5, abs=0.11)


def test_horizon_stands_for_below():
    low = sky_ab_mag(QUALITY, 5478.0, np.array([0.0, -20.0]), 30.0, 0.5, 60.0)
    assert low[0] == low[1]


def test_everything_broadcasts():
    shape = sky_ab_mag(
        QUALITY, np.array([4000.0, 5000.0])[:, None, None], np.linspace(20, 80, 3)[:, None],
        np.array([-5.0, 20.0, 40.0, 60.0]), 0.7, 50.0,
    ).shape  # fmt: skip
    assert shape == (2, 3, 4)


def test_sky_over_targets_puts_positions_and_moon_together(monkeypatch):
    rng = np.random.default_rng(2)
    ra, dec = rng.uniform(0, 360, 5)[:, None], rng.uniform(-70, 10, 5)[:, None]
    mjd = 61465.0 + np.sort(rng.uniform(0, 30, 40))
    asked = []

    def spy(site, times):
        asked.append(np.shape(times))
        return sun_moon_at(site, times)

    monkeypatch.setattr(brightness, "sun_moon_at", spy)
    table = sky_at(ra, dec, SITE, 5000.0, mjd)
    assert table.shape == (5, 40)
    assert asked == [(40,)]
    moon = sun_moon_at(SITE, mjd)
    expected = sky_ab_mag(
        QUALITY,
        5000.0,
        positions_at(ra, dec, SITE, mjd).altitude_deg,
        moon.moon_altitude_deg,
        moon.moon_illumination,
        moon_separation(ra, dec, SITE, mjd),
    )
    np.testing.assert_allclose(table, expected, atol=0.002)
    assert np.ptp(table) > 1.0
    wavelengths = np.linspace(4500, 7000, 5)[:, None]
    row = sky_at(ra[2], dec[2], SITE, wavelengths[2], mjd)
    np.testing.assert_allclose(sky_at(ra, dec, SITE, wavelengths, mjd)[2], row, rtol=1e-12)
