import numpy as np
import pytest
from astropy import units as u
from astropy.coordinates import AltAz, EarthLocation, SkyCoord
from astropy.time import Time

from planner.base.timescale import offline
from planner.export.standards import STANDARDS, standards_for

MJD = np.array([61465.1, 61465.3, 61560.2])
RA, DEC = np.array([175.5, 181.0, 260.0]), np.array([-32.0, -20.0, -10.0])


def airmasses(ra_deg, dec_deg, site, mjd):
    """Astropy's sec z, of one time."""
    with offline():
        place = EarthLocation.from_geodetic(
            site.longitude_deg * u.deg, site.latitude_deg * u.deg, site.elevation_m * u.m
        )
        frame = AltAz(obstime=Time(mjd, format="mjd", scale="utc"), location=place)
        altitude = SkyCoord(ra_deg * u.deg, dec_deg * u.deg).transform_to(frame).alt.deg
    return np.where(altitude > 0, 1 / np.sin(np.radians(np.maximum(altitude, 1e-6))), np.inf)


def test_no_standard_up_is_nearer_in_airmass(site):
    star_ra = np.array([s.ra_deg for s in STANDARDS])
    star_dec = np.array([s.dec_deg for s in STANDARDS])
    found = standards_for(RA, DEC, site, MJD, 2.0)
    for i, matches in enumerate(found):
        target = airmasses(RA[i], DEC[i], site, MJD[i])
        stars = airmasses(star_ra, star_dec, site, MJD[i])
        far = np.where(stars <= 2.0, abs(stars - target), np.inf)
        assert len(matches) == 2
        for match, wanted in zip(matches, np.argsort(far)[:2], strict=True):
            assert match.standard is STANDARDS[wanted]
            assert match.airmass == pytest.approx(stars[wanted], rel=1e-3)
            assert match.target_airmass == pytest.approx(float(target), rel=1e-3)


def test_none_is_named_where_none_is_up(site):
    assert standards_for(RA, DEC, site, MJD, 1.0) == [(), (), ()]
    assert standards_for([], [], site, [], 2.0) == []


def test_the_list_covers_the_sky():
    """Within 50 degrees of any direction; names, magnitudes and sources as published."""
    stars = SkyCoord([s.ra_deg for s in STANDARDS] * u.deg, [s.dec_deg for s in STANDARDS] * u.deg)
    ra, dec = np.meshgrid(np.arange(0, 360, 10), np.arange(-85, 86, 10))
    grid = SkyCoord(ra.ravel() * u.deg, dec.ravel() * u.deg)
    assert grid.match_to_catalog_sky(stars)[1].deg.max() < 50
    assert len({s.name for s in STANDARDS}) == len(STANDARDS)
    assert all(9 < s.v_mag < 13.5 for s in STANDARDS)


# Degrees as the CALSPEC and SIMBAD data bases list them, from memory, to 3 decimals.
@pytest.mark.parametrize(
    ("name", "ra_deg", "dec_deg"),
    [
        ("G191-B2B", 76.378, 52.831),
        ("BD+28 4211", 327.796, 28.864),
        ("Feige 110", 349.993, -5.166),
        ("BD+75 325", 122.705, 74.966),
        ("LTT 1020", 28.707, -27.475),
        ("EG 274", 245.891, -39.230),
    ],
)
def test_positions_agree_with_data_bases(name, ra_deg, dec_deg):
    star = next(s for s in STANDARDS if s.name == name)
    wanted = SkyCoord(ra_deg * u.deg, dec_deg * u.deg)
    found = SkyCoord(star.ra_deg * u.deg, star.dec_deg * u.deg)
    assert found.separation(wanted).arcsec < 5
