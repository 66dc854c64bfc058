"""How bright the sky is: extinction, dark sky and moonlight.

Moonlight after Krisciunas & Schaefer (1991, PASP 103, 1033; K&S below), good to 8-23 % in V. Other
wavelengths take their form with the extinction there, times the colour of the moon. Twilight,
the moon's changing distance (within 15 %), clouds and the Milky Way are left out.
"""

from __future__ import annotations

from typing import overload

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.base.bands import BANDS
from planner.model.observatory import Site, SkyQuality
from planner.sky.local import unit_vectors
from planner.sky.positions import positions_at, sun_moon_at

__all__ = ["dark_ab_mag_at", "extinction_at", "sky_ab_mag", "sky_at"]

Floats = NDArray[np.float64]

SUN_AB_MAG = {
    "u": 6.39, "B": 5.31, "g": 5.11, "V": 4.80, "r": 4.65, "R": 4.60, "i": 4.53, "z": 4.50,
}  # fmt: skip
"""Absolute magnitudes of the sun: Willmer (2018, ApJS 236, 47, table 3), from memory."""

ALBEDO_SLOPE = 1.1
"""The moon reflects as wavelength to this power: within 0.15 mag of the full moon's reflectances
of Kieffer & Stone (2005, AJ 129, 2887, table 4) from 3500 to 8900 angstrom."""

_SURGE_DEG = 7.0
_MOON_RADIUS_DEG = 0.26


@overload
def extinction_at(quality: SkyQuality, wavelength_a: float) -> float: ...
@overload
def extinction_at(quality: SkyQuality, wavelength_a: Floats) -> Floats: ...
def extinction_at(quality: SkyQuality, wavelength_a: float | Floats) -> float | Floats:
    """Return the extinction in magnitudes per unit airmass.

    Linear in wavelength between the pivots of the bands given, constant beyond the outer ones;
    shaped like `wavelength_a` (observed, angstrom).
    """
    return _between(dict(quality.extinction_mag), wavelength_a)


@overload
def dark_ab_mag_at(quality: SkyQuality, wavelength_a: float) -> float: ...
@overload
def dark_ab_mag_at(quality: SkyQuality, wavelength_a: Floats) -> Floats: ...
def dark_ab_mag_at(quality: SkyQuality, wavelength_a: float | Floats) -> float | Floats:
    """Return the moonless zenith's AB magnitude per square arcsec; as `extinction_at`.

    Airglow lines, strong beyond 7000 angstrom, are spread over their bands.
    """
    ab = {band: mag + BANDS[band].ab_minus_vega_mag for band, mag in quality.dark_mag}
    return _between(ab, wavelength_a)


def sky_ab_mag(
    quality: SkyQuality,
    wavelength_a: ArrayLike,
    altitude_deg: ArrayLike,
    moon_altitude_deg: ArrayLike,
    moon_illumination: ArrayLike,
    moon_separation_deg: ArrayLike,
) -> NDArray[np.float64]:
    """Return the brightness of the night sky; all but the first broadcast together.

    Parameters
    ----------
    quality : SkyQuality
        Dark sky and extinction of the site.
    wavelength_a : array_like
        Observed, angstrom.
    altitude_deg : array_like
        Of the target; below the horizon it is taken as the horizon.
    moon_altitude_deg : array_like
        A moon at or below the horizon gives no light.
    moon_illumination : array_like
        Illuminated fraction of the disc, 0 to 1.
    moon_separation_deg : array_like
        Of target and moon.

    Returns
    -------
    ndarray
        AB magnitude per square arcsec, as seen through the air.

    Notes
    -----
    Dark sky: K&S eq. 2 with their path length X (eq. 3), not the airmass of starlight. Moon: their
    eq. 15 for V with the extinction at the wavelength, phase angle from the illuminated fraction,
    eq. 20 for its brightness and up to 35 % more within 7 degrees of opposition. Within 10 degrees
    of the moon their aureole, constant inside its disc.

    A full moon 60 degrees from the zenith and from a target at 70 degrees' altitude brightens a
    dark site's u by 2.8 mag, B by 3.7, V by 3.2, R by 2.7 and i by 1.9, a day before or after by
    half a magnitude less. Usual figures for full moon are B 4, V 3 and I 1-1.5; Patat (2003,
    A&A 400, 1183, section 7) measured up to 3 in B and 1.2 in I ten days after new moon.
    """
    wavelength = np.asarray(wavelength_a, dtype=np.float64)
    extinction = extinction_at(quality, wavelength)
    path = _path_length(altitude_deg)
    dark_mag = dark_ab_mag_at(quality, wavelength) + extinction * (path - 1.0)
    moonlight_nl = _moonlight_nl(
        extinction, path, moon_altitude_deg, moon_illumination, moon_separation_deg
    )
    # K&S eq. 1 with the flux of V = 0 as unit: B = 34.08 exp(20.7233 - 0.92104 V) nL
    moonlight = moonlight_nl / (34.08 * np.exp(20.7233))
    colour_mag = BANDS["V"].ab_minus_vega_mag + _moon_minus_v_mag(wavelength)
    flux = path * 10.0 ** (-0.4 * dark_mag) + moonlight * 10.0 ** (-0.4 * colour_mag)
    return np.asarray(-2.5 * np.log10(flux))


def sky_at(
    ra_deg: ArrayLike, dec_deg: ArrayLike, site: Site, wavelength_a: ArrayLike, mjd: ArrayLike
) -> NDArray[np.float64]:
    """Return the brightness of the sky at targets, AB magnitude per square arcsec.

    Parameters
    ----------
    ra_deg, dec_deg : array_like
        Targets, ICRS.
    site : Site
        Observatory, with its sky's quality.
    wavelength_a : array_like
        Observed, angstrom.
    mjd : array_like
        UTC. All broadcast together (``ra[:, None]`` against times gives a table); sun and moon are
        computed once for each element of `mjd`.

    Raises
    ------
    ValueError
        For coordinates out of range, or dates before 1972.

    Notes
    -----
    The target is not shifted by aberration where its distance from the moon is taken (at most
    0.006 degrees). Values in daylight or twilight are those of a night sky.
    """
    moon = sun_moon_at(site, mjd)
    towards_moon = unit_vectors(moon.moon_ra_deg, moon.moon_dec_deg)
    cosine = np.einsum("...i,...i->...", unit_vectors(ra_deg, dec_deg), towards_moon)
    return sky_ab_mag(
        site.sky,
        wavelength_a,
        positions_at(ra_deg, dec_deg, site, mjd).altitude_deg,
        moon.moon_altitude_deg,
        moon.moon_illumination,
        np.degrees(np.arccos(np.clip(cosine, -1.0, 1.0))),
    )


def _between(by_band: dict[str, float], wavelength_a: float | Floats) -> float | Floats:
    pivots, values = zip(
        *sorted((BANDS[band].pivot_a, value) for band, value in by_band.items()), strict=True
    )
    result: float | Floats = np.interp(wavelength_a, pivots, values)
    return result


def _path_length(altitude_deg: ArrayLike) -> Floats:
    """Return the way through the glowing and scattering air in units of the zenith's: K&S eq. 3."""
    cosine = np.cos(np.radians(np.clip(altitude_deg, 0.0, 90.0)))
    return np.asarray(1.0 / np.sqrt(1.0 - 0.96 * cosine**2))


def _moonlight_nl(
    extinction: float | Floats,
    path: Floats,
    moon_altitude_deg: ArrayLike,
    moon_illumination: ArrayLike,
    moon_separation_deg: ArrayLike,
) -> Floats:
    """Return the scattered moonlight in nanolambert, for a moon of its colour in V."""
    phase = np.degrees(np.arccos(np.clip(2.0 * np.asarray(moon_illumination) - 1.0, -1.0, 1.0)))
    surge = 1.0 + 0.35 * np.maximum(1.0 - phase / _SURGE_DEG, 0.0)
    moon = surge * 10.0 ** (-0.4 * (3.84 + 0.026 * phase + 4e-9 * phase**4))
    moon = np.where(np.asarray(moon_altitude_deg) > 0.0, moon, 0.0)
    at_moon = 10.0 ** (-0.4 * extinction * _path_length(moon_altitude_deg))
    scattered = 1.0 - 10.0 ** (-0.4 * extinction * path)
    return np.asarray(_scattering(moon_separation_deg) * moon * at_moon * scattered)


def _scattering(separation_deg: ArrayLike) -> Floats:
    """Return K&S's function f of the angle between moon and target (eqs. 16-19, 21)."""
    rho = np.maximum(np.asarray(separation_deg, dtype=np.float64), _MOON_RADIUS_DEG)
    gas = 10.0**5.36 * (1.06 + np.cos(np.radians(rho)) ** 2)
    dust = np.where(rho < 10.0, 6.2e7 / rho**2, 10.0 ** (6.15 - rho / 40.0))
    return np.asarray(gas + dust)


def _moon_minus_v_mag(wavelength_a: Floats) -> float | Floats:
    """Return the moon's colour against V, both AB: the sun's and the reflection's."""
    pivot_v = BANDS["V"].pivot_a
    by_band = {
        band: mag
        - SUN_AB_MAG["V"]
        - 2.5 * ALBEDO_SLOPE * float(np.log10(BANDS[band].pivot_a / pivot_v))
        for band, mag in SUN_AB_MAG.items()
    }
    return _between(by_band, wavelength_a)
