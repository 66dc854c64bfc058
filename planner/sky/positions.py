"""Positions of targets, sun and moon over a site at given times."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.model.observatory import Site
from planner.sky.ephemeris import Ephemeris
from planner.sky.local import Place, apparent, turned, unit_vectors

__all__ = [
    "Positions",
    "SunMoon",
    "airmass_of",
    "moon_separation",
    "positions_at",
    "sun_moon_at",
]


class Positions(NamedTuple):
    """Where targets stand over a site; each array has the broadcast shape of the request."""

    altitude_deg: NDArray[np.float64]
    """Without refraction."""
    azimuth_deg: NDArray[np.float64]
    """From north through east, 0 to 360."""
    hour_angle_deg: NDArray[np.float64]
    """West positive, -180 to 180."""
    parallactic_angle_deg: NDArray[np.float64]
    """Position angle of the zenith at the target, from north through east, -180 to 180."""


class SunMoon(NamedTuple):
    """Sun and moon over a site; topocentric, centres of the discs, without refraction."""

    sun_altitude_deg: NDArray[np.float64]
    moon_altitude_deg: NDArray[np.float64]
    moon_illumination: NDArray[np.float64]
    """Illuminated fraction of the disc, 0 to 1, seen from the Earth's centre."""
    moon_ra_deg: NDArray[np.float64]
    """Apparent and topocentric, on the axes of the ICRS."""
    moon_dec_deg: NDArray[np.float64]


def positions_at(ra_deg: ArrayLike, dec_deg: ArrayLike, site: Site, mjd: ArrayLike) -> Positions:
    """Return altitude, azimuth, hour angle and parallactic angle.

    Parameters
    ----------
    ra_deg, dec_deg : array_like
        Targets, ICRS.
    site : Site
        Observatory.
    mjd : array_like
        UTC; must broadcast with the targets (``ra[:, None]`` against times gives a table).

    Returns
    -------
    Positions
        Arrays of the broadcast shape.

    Raises
    ------
    ValueError
        For coordinates out of range, or dates before 1972.

    Notes
    -----
    Parallactic angle by tan q = sin H / (tan phi cos delta - sin delta cos H) with two-argument
    arctangent (Filippenko 1982 gives the sine form, which folds at 90 degrees).
    """
    mjd = np.asarray(mjd, dtype=np.float64)
    place = Place.of(site)
    meridian = turned(_apparent_at(ra_deg, dec_deg, mjd), place.rotation_angle(mjd))
    x, y, z = np.moveaxis(meridian, -1, 0)
    sin_phi, cos_phi = place.sin_latitude, place.cos_latitude
    north = z * cos_phi - x * sin_phi
    up = x * cos_phi + z * sin_phi
    hour_angle = np.arctan2(-y, x)
    # sin H cos phi and (sin phi cos delta - cos phi sin delta cos H)
    parallactic = np.arctan2(
        np.sin(hour_angle) * cos_phi, sin_phi * np.hypot(x, y) - cos_phi * z * np.cos(hour_angle)
    )
    return Positions(
        np.degrees(np.arctan2(up, np.hypot(north, y))),
        np.degrees(np.arctan2(y, north)) % 360.0,
        np.degrees(hour_angle),
        np.degrees(parallactic),
    )


def sun_moon_at(site: Site, mjd: ArrayLike) -> SunMoon:
    """Return sun and moon over `site` at UTC `mjd` (any shape). Raises `ValueError` before 1972."""
    mjd = np.asarray(mjd, dtype=np.float64)
    place = Place.of(site)
    ephemeris = _ephemeris(mjd)
    to_date = ephemeris.to_date(mjd)
    sun = place.seen(np.einsum("...ij,...j->...i", to_date, ephemeris.sun(mjd)), mjd)
    moon = place.seen(np.einsum("...ij,...j->...i", to_date, ephemeris.moon(mjd)), mjd)
    moon_icrs = np.einsum("...ji,...j->...i", to_date, turned(moon, -place.rotation_angle(mjd)))
    return SunMoon(
        np.degrees(np.arcsin(place.sin_altitude(sun))),
        np.degrees(np.arcsin(place.sin_altitude(moon))),
        ephemeris.illumination(mjd),
        np.degrees(np.arctan2(moon_icrs[..., 1], moon_icrs[..., 0])) % 360.0,
        np.degrees(np.arcsin(moon_icrs[..., 2])),
    )


def moon_separation(
    ra_deg: ArrayLike, dec_deg: ArrayLike, site: Site, mjd: ArrayLike
) -> NDArray[np.float64]:
    """Return the distance of targets (ICRS) from the topocentric moon, in degrees.

    Shapes and errors as in `positions_at`; the angle is given whether or not the moon is up.
    """
    mjd = np.asarray(mjd, dtype=np.float64)
    place = Place.of(site)
    target = turned(_apparent_at(ra_deg, dec_deg, mjd), place.rotation_angle(mjd))
    ephemeris = _ephemeris(mjd)
    moon = place.seen(
        np.einsum("...ij,...j->...i", ephemeris.to_date(mjd), ephemeris.moon(mjd)), mjd
    )
    chord = np.linalg.norm(target - moon, axis=-1)
    return np.asarray(np.degrees(2.0 * np.arcsin(np.minimum(chord / 2.0, 1.0))))


def airmass_of(altitude_deg: ArrayLike) -> NDArray[np.float64]:
    """Return sec z, infinite at and below the horizon.

    The plane-parallel form, as astropy's ``secz``: within 0.5 % of the curved atmosphere up to
    airmass 2 and 1 % up to 3.
    """
    sine = np.asarray(np.sin(np.radians(altitude_deg)))
    airmass = np.full(sine.shape, np.inf)
    np.divide(1.0, sine, out=airmass, where=sine > 0.0)
    return airmass


def _ephemeris(mjd: NDArray[np.float64]) -> Ephemeris:
    return Ephemeris.over(mjd.min(), mjd.max()) if mjd.size else Ephemeris.over(51544.0, 51544.0)


def _apparent_at(
    ra_deg: ArrayLike, dec_deg: ArrayLike, mjd: NDArray[np.float64]
) -> NDArray[np.float64]:
    ephemeris = _ephemeris(mjd)
    return apparent(unit_vectors(ra_deg, dec_deg), ephemeris.velocity(mjd), ephemeris.to_date(mjd))
