"""Published spectrophotometric standard stars, and which of them suit a spectrum."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from planner.model.observatory import Site
from planner.sky import airmass_of, positions_at

__all__ = ["STANDARDS", "Match", "Standard", "standards_for"]

OKE = "Oke 1990, AJ 99, 1621"
HAMUY = "Hamuy et al. 1992, PASP 104, 533; 1994, PASP 106, 566"


@dataclass(frozen=True, slots=True)
class Standard:
    """One star with a published spectral energy distribution."""

    name: str
    ra_deg: float
    """ICRS; of epoch 2000 where the source says so. Nearby white dwarfs move by up to some tenths
    of an arcsecond a year: identify the star on a chart."""
    dec_deg: float
    v_mag: float
    source: str
    """Of the energy distribution."""


def _star(name: str, ra: str, dec: str, v_mag: float, source: str) -> Standard:
    """Take ``hh mm ss`` and ``+dd mm ss``."""
    hours, minutes, seconds = (float(part) for part in ra.split())
    degrees, arcmin, arcsec = (float(part) for part in dec[1:].split())
    size = degrees + arcmin / 60 + arcsec / 3600
    return Standard(
        name,
        15 * (hours + minutes / 60 + seconds / 3600),
        -size if dec.startswith("-") else size,
        v_mag,
        source,
    )


# Left out: LTT 3218, LTT 4364 and L745-46A, which move by more than an arcsecond a year, and stars
# fainter than V = 13.5.
STANDARDS = (
    # Positions and V of these as ESO's page on Oke's standards gives them (read).
    _star("G191-B2B", "05 05 30.6", "+52 49 54", 11.78, OKE),
    _star("BD+75 325", "08 10 49.3", "+74 57 57", 9.54, OKE),
    _star("Feige 34", "10 39 36.7", "+43 06 10", 11.18, OKE),
    _star("Feige 66", "12 37 23.6", "+25 04 00", 10.50, OKE),
    _star("Feige 67", "12 41 51.8", "+17 31 20", 11.81, OKE),
    _star("HZ 44", "13 23 35.4", "+36 08 00", 11.66, OKE),
    _star("Grw+70 5824", "13 38 51.8", "+70 17 08", 12.77, OKE),
    # Positions as public lists of standards give them (read); V from memory.
    _star("BD+33 2642", "15 51 59.9", "+32 56 53", 10.81, OKE),
    _star("Feige 110", "23 19 58.4", "-05 09 56", 11.82, OKE),
    # Position and V from memory.
    _star("BD+28 4211", "21 51 11.1", "+28 51 52", 10.51, OKE),
    # Positions and V as public lists of standards give them (read).
    _star("LTT 377", "00 41 46.8", "-33 39 08", 11.23, HAMUY),
    _star("LTT 1020", "01 54 49.7", "-27 28 30", 11.52, HAMUY),
    # Positions as public lists of standards give them (read); V from memory.
    _star("EG 21", "03 10 31.0", "-68 36 02", 11.38, HAMUY),
    _star("LTT 1788", "03 48 22.2", "-39 08 34", 13.16, HAMUY),
    _star("LTT 2415", "05 56 24.3", "-27 51 29", 12.21, HAMUY),
    _star("Hiltner 600", "06 45 13.4", "+02 08 14", 10.44, HAMUY),
    _star("LTT 3864", "10 32 13.9", "-35 37 42", 12.17, HAMUY),
    _star("Feige 56", "12 06 47.3", "+11 40 13", 11.06, HAMUY),
    _star("CD-32 9927", "14 11 46.4", "-33 03 14", 10.42, HAMUY),
    _star("LTT 6248", "15 39 00.0", "-28 35 33", 11.80, HAMUY),
    _star("EG 274", "16 23 33.8", "-39 13 48", 11.03, HAMUY),
    _star("LTT 7379", "18 36 26.3", "-44 18 33", 10.23, HAMUY),
    _star("LTT 7987", "20 10 57.4", "-30 13 01", 12.23, HAMUY),
    _star("LTT 9239", "22 52 40.9", "-20 35 26", 12.07, HAMUY),
)
"""Standards over the whole sky, rounded to an arcsecond."""


@dataclass(frozen=True, slots=True)
class Match:
    """A standard star beside one spectrum."""

    standard: Standard
    airmass: float
    """Of the star at the spectrum's time."""
    target_airmass: float


def standards_for(
    ra_deg: ArrayLike,
    dec_deg: ArrayLike,
    site: Site,
    mjd: ArrayLike,
    airmass_max: float,
    count: int = 2,
) -> list[tuple[Match, ...]]:
    """Return the standards nearest in airmass to each of several spectra at its time.

    Parameters
    ----------
    ra_deg, dec_deg : array_like, shape (spectra,)
        Targets, ICRS.
    site : Site
        Observatory.
    mjd : array_like, shape (spectra,)
        UTC of each spectrum.
    airmass_max : float
        Standards above this airmass are passed over.
    count : int
        Most standards for one spectrum.

    Returns
    -------
    list of tuple of Match
        Nearest in airmass first; fewer than `count`, or none, where so few are up.

    Raises
    ------
    ValueError
        As `planner.sky.positions_at`.
    """
    mjd = np.asarray(mjd, dtype=np.float64)
    target = airmass_of(positions_at(ra_deg, dec_deg, site, mjd).altitude_deg)
    star_ra = np.array([s.ra_deg for s in STANDARDS])[:, None]
    star_dec = np.array([s.dec_deg for s in STANDARDS])[:, None]
    stars = airmass_of(positions_at(star_ra, star_dec, site, mjd).altitude_deg)
    return [
        tuple(
            Match(STANDARDS[i], float(stars[i, spectrum]), float(target[spectrum]))
            for i in np.argsort(abs(stars[:, spectrum] - target[spectrum]), kind="stable")
            if stars[i, spectrum] <= airmass_max
        )[:count]
        for spectrum in range(mjd.size)
    ]
