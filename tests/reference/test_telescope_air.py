"""Refraction, airmass and parallactic angle against published tables, formulas and astroplan."""

import numpy as np
import pytest
from astropy import units as u
from astropy.coordinates import TETE, SkyCoord
from astropy.time import Time

from planner.base.timescale import offline
from planner.model.observatory import Site, SkyQuality, WeatherClimate
from planner.sky import airmass_of, observer, positions_at
from planner.telescope.refraction import differential_refraction_arcsec, refractivity

# Filippenko (1982, PASP 94, 715, table 1) as reprinted on CTIO's page on differential refraction;
# its rows beyond 1.90 are mislabelled there by 0.05 and left out
WAVELENGTHS = [3000, 3500, 4000, 4500, 5000, 5500, 6000, 6500, 7000, 8000, 10000]
TABLE = {
    1.05: [0.68, 0.38, 0.20, 0.08, 0.00, -0.06, -0.11, -0.14, -0.17, -0.21, -0.26],
    1.20: [1.40, 0.80, 0.42, 0.17, 0.00, -0.13, -0.22, -0.30, -0.35, -0.44, -0.54],
    1.50: [2.37, 1.34, 0.71, 0.29, 0.00, -0.21, -0.37, -0.50, -0.60, -0.74, -0.91],
}


@pytest.mark.parametrize("airmass", TABLE)
def test_filippenkos_table(airmass):
    ours = differential_refraction_arcsec(np.array(WAVELENGTHS, float), 5000.0, airmass)
    np.testing.assert_allclose(ours, TABLE[airmass], atol=0.0075)


def test_zenith_and_guiding():
    assert differential_refraction_arcsec(4000.0, 5000.0, 1.0) == 0.0
    blue = differential_refraction_arcsec(4000.0, 6000.0, 1.5)
    assert blue == pytest.approx(0.71 + 0.37, abs=0.01)


def test_refractivity_at_the_sites_pressure():
    # air of 15 C and 760 mmHg: n - 1 = 2.790e-4 at 5000 A (Edlen; from memory); at 600 mmHg and 7 C
    # thinner by 600 / 760 x 288.15 / 280.15, less the vapour's 0.5e-6
    expected = 2.790e-4 * 600 / 760 * 288.15 / 280.15 - 0.5e-6
    assert refractivity(5000.0) == pytest.approx(expected, rel=2e-3)


def test_sec_z_against_curved_air():
    zenith_deg = np.linspace(0.0, 60.0, 61)
    cosine = np.cos(np.radians(zenith_deg))
    ours = airmass_of(90.0 - zenith_deg)
    # Kasten & Young (1989, Applied Optics 28, 4735), Young (1994, Applied Optics 33, 1108)
    kasten = 1 / (cosine + 0.50572 * (96.07995 - zenith_deg) ** -1.6364)
    young = (1.002432 * cosine**2 + 0.148386 * cosine + 0.0096467) / (
        cosine**3 + 0.149864 * cosine**2 + 0.0102963 * cosine + 0.000303978
    )
    assert young[45] == pytest.approx(1.4121, abs=1e-4)
    assert kasten[60] == pytest.approx(1.9943, abs=1e-4)
    np.testing.assert_allclose(ours, kasten, rtol=0.005)
    np.testing.assert_allclose(ours, young, rtol=0.005)


@pytest.mark.parametrize("latitude", [-30.4, 31.96, 57.0])
def test_parallactic_angle_against_astroplan(latitude):
    site = Site(
        "here", latitude, 12.0, 1500.0, None, WeatherClimate((1.0,) * 12, 2.0),
        SkyQuality(1.2, (), ()),
    )  # fmt: skip
    rng = np.random.default_rng(8)
    mjd = 61545.0 + rng.uniform(-180, 180, 60)
    ra, dec = rng.uniform(0, 360, 60), np.clip(latitude + rng.uniform(-60, 60, 60), -85, 85)
    ours = positions_at(ra, dec, site, mjd)
    with offline():
        times, there = Time(mjd, format="mjd"), observer(site)
        # astroplan takes the coordinates it is given for those of the date, and mean sidereal
        # time, up to 0.005 degrees from the apparent one
        frame = TETE(obstime=times, location=there.location)
        of_date = SkyCoord(ra * u.deg, dec * u.deg).transform_to(frame)
        theirs = there.parallactic_angle(times, SkyCoord(of_date.ra, of_date.dec))
    up = (ours.altitude_deg > 10) & (ours.altitude_deg < 80)
    assert up.sum() > 10
    apart = (theirs.to_value(u.deg) - ours.parallactic_angle_deg + 180) % 360 - 180
    np.testing.assert_allclose(apart[up], 0.0, atol=0.02)
