"""Where sun, moon and Earth are: a smooth table over a span of dates, made once, read often."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import erfa
import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from planner.base.timescale import tt_of_utc

__all__ = ["Ephemeris"]

_MJD0 = 2400000.5
_MOON_STEPS_PER_DAY = 4
_BLOCK_D = 64
"""Spans are widened to whole blocks, so that requests for nearby dates share one table."""
_AU_PER_DAY_IN_C = erfa.DAU / erfa.DAYSEC / erfa.CMPS


@dataclass(frozen=True, slots=True)
class Ephemeris:
    """Sun, moon and the orientation of the Earth's axis over a span of UTC dates.

    The analytical theories behind (Earth: VSOP87-based `epv00`; moon: Meeus 1998, `moon98`;
    precession and nutation: IAU 2006/2000A) are the ones astropy uses without extra files.
    Cubic splines through daily (moon: six-hourly) values stay within 0.05 arcsec of them.
    """

    daily: CubicSpline
    """Sun (3, au), Earth's velocity (3, of light), X, Y, s of the celestial pole."""
    moon_au: CubicSpline

    @classmethod
    def over(cls, first_mjd: float, last_mjd: float) -> Ephemeris:
        """Return the table for the UTC dates from `first_mjd` to `last_mjd`, or longer."""
        return _table(
            math.floor(first_mjd / _BLOCK_D) * _BLOCK_D - 2,
            math.ceil(last_mjd / _BLOCK_D) * _BLOCK_D + 2,
        )

    def sun(self, mjd: NDArray[np.float64]) -> NDArray[np.float64]:
        """Apparent geocentric sun, axes of the GCRS, au; shape (..., 3)."""
        return np.asarray(self.daily(mjd)[..., 0:3])

    def moon(self, mjd: NDArray[np.float64]) -> NDArray[np.float64]:
        """Apparent geocentric moon, axes of the GCRS, au; shape (..., 3).

        Aberration and the moon's own light-time cancel but for 0.7 arcsec, which is left out.
        """
        return np.asarray(self.moon_au(mjd))

    def velocity(self, mjd: NDArray[np.float64]) -> NDArray[np.float64]:
        """Barycentric velocity of the Earth in units of the speed of light; shape (..., 3)."""
        return np.asarray(self.daily(mjd)[..., 3:6])

    def to_date(self, mjd: NDArray[np.float64]) -> NDArray[np.float64]:
        """Rotation from the GCRS to the intermediate frame of date; shape (..., 3, 3)."""
        x, y, s = np.moveaxis(self.daily(mjd)[..., 6:9], -1, 0)
        return np.asarray(erfa.c2ixys(x, y, s))

    def illumination(self, mjd: NDArray[np.float64]) -> NDArray[np.float64]:
        """Illuminated fraction of the moon's disc seen from the Earth's centre, 0 to 1.

        (1 + cos i)/2 with the phase angle i at the moon between sun and Earth (e.g. Meeus 1998,
        Astronomical Algorithms, chapter 48).
        """
        moon = self.moon(mjd)
        to_sun = self.sun(mjd) - moon
        cosine = -np.sum(to_sun * moon, axis=-1) / (
            np.linalg.norm(to_sun, axis=-1) * np.linalg.norm(moon, axis=-1)
        )
        return np.asarray((1.0 + cosine) / 2.0)


@lru_cache(maxsize=8)
def _table(first: int, last: int) -> Ephemeris:
    day = np.arange(float(first), last + 1.0)
    quarter = np.linspace(first, last, _MOON_STEPS_PER_DAY * (day.size - 1) + 1)
    return Ephemeris(
        CubicSpline(day, _daily_values(tt_of_utc(day))),
        CubicSpline(quarter, erfa.moon98(_MJD0, tt_of_utc(quarter))["p"]),
    )


def _daily_values(tt_mjd: NDArray[np.float64]) -> NDArray[np.float64]:
    heliocentric, barycentric = erfa.epv00(_MJD0, tt_mjd)
    velocity = barycentric["v"] * _AU_PER_DAY_IN_C
    sun = -heliocentric["p"]
    distance = np.linalg.norm(sun, axis=-1, keepdims=True)
    pole = np.stack(erfa.xys06a(_MJD0, tt_mjd), axis=-1)
    return np.concatenate([sun + distance * velocity, velocity, pole], axis=-1)
