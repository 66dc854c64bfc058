"""From directions among the stars to directions over a site.

The meridian frame has x in the site's meridian on the equator, y east of it, z to the celestial
pole of date. No refraction: altitudes are those of an airless Earth.
"""

from __future__ import annotations

from dataclasses import dataclass

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.model.observatory import Site

__all__ = ["Place", "apparent", "turned", "unit_vectors"]

_MJD0 = 2400000.5
_WGS84 = 1


@dataclass(frozen=True, slots=True)
class Place:
    """What the geometry needs of a site."""

    longitude_rad: float
    sin_latitude: float
    cos_latitude: float
    meridian_au: NDArray[np.float64]
    """The site's position from the Earth's centre, in the meridian frame."""

    @classmethod
    def of(cls, site: Site) -> Place:
        """Take the numbers from a site's record (geodetic coordinates on WGS84)."""
        longitude, latitude = np.radians(site.longitude_deg), np.radians(site.latitude_deg)
        x, y, z = erfa.gd2gc(_WGS84, longitude, latitude, site.elevation_m)
        return cls(
            float(longitude),
            float(np.sin(latitude)),
            # zero at the poles in spite of rounding
            float(np.sin(np.radians(90.0 - abs(site.latitude_deg)))),
            np.array([np.hypot(x, y), 0.0, z]) / erfa.DAU,
        )

    def rotation_angle(self, mjd: NDArray[np.float64]) -> NDArray[np.float64]:
        """Local Earth rotation angle, rad: right ascension of date on the meridian (UT1 = UTC)."""
        return np.asarray(erfa.era00(_MJD0, mjd) + self.longitude_rad)

    def seen(
        self, geocentric_au: NDArray[np.float64], mjd: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """Topocentric unit vectors, meridian frame, of a body given in the frame of date."""
        return normalised(turned(geocentric_au, self.rotation_angle(mjd)) - self.meridian_au)

    def sin_altitude(self, meridian: NDArray[np.float64]) -> NDArray[np.float64]:
        """Sine of the altitude of unit vectors of the meridian frame."""
        return np.asarray(
            meridian[..., 0] * self.cos_latitude + meridian[..., 2] * self.sin_latitude
        )


def turned(vector: NDArray[np.float64], angle: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the vectors in axes turned by `angle` (rad) about z; the last axis holds x, y, z."""
    cosine, sine = np.cos(angle), np.sin(angle)
    x, y, z = np.moveaxis(vector, -1, 0)
    return np.stack(np.broadcast_arrays(cosine * x + sine * y, cosine * y - sine * x, z), axis=-1)


def unit_vectors(ra_deg: ArrayLike, dec_deg: ArrayLike) -> NDArray[np.float64]:
    """Return unit vectors of spherical coordinates; shape (..., 3).

    Raises
    ------
    ValueError
        If a coordinate is not finite or a declination lies outside -90 to 90 degrees.
    """
    ra, dec = np.broadcast_arrays(np.radians(ra_deg), np.radians(dec_deg))
    if not (np.isfinite(ra).all() and np.isfinite(dec).all() and (abs(dec) <= np.pi / 2).all()):
        raise ValueError("right ascension must be finite and declination within -90 to 90 degrees")
    return np.asarray(erfa.s2c(ra, dec))


def normalised(vector: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the vectors scaled to length one along the last axis."""
    return np.asarray(vector / np.linalg.norm(vector, axis=-1, keepdims=True))


def apparent(
    direction: NDArray[np.float64], velocity: NDArray[np.float64], to_date: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return the apparent place of distant targets as unit vectors in the frame of date.

    Annual aberration to first order in v/c (the rest is below 0.001 arcsec), then precession and
    nutation. Diurnal aberration (0.3 arcsec) and light bending (below 0.1 arcsec at night) are
    left out.
    """
    return normalised(np.einsum("...ij,...j->...i", to_date, direction + velocity))
