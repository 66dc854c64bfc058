"""The moon's track through each night over one site."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.sky.ephemeris import Ephemeris
from planner.sky.local import Place, turned

__all__ = ["moon_track"]

_SAMPLES = 97
"""Per night: at most 15 minutes apart, so that cubics between them err by 0.1 arcsec."""


def moon_track(
    place: Place,
    ephemeris: Ephemeris,
    to_date: NDArray[np.float64],
    start_mjd: NDArray[np.float64],
    end_mjd: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return the moon at evenly spaced times, both ends included, of spans of at most a day.

    Parameters
    ----------
    place : Place
        Where the moon is seen from.
    ephemeris : Ephemeris
        Covering the spans.
    to_date : ndarray, shape (nights, 3, 3)
        Rotation from the GCRS to the frame of date, one for each night.
    start_mjd, end_mjd : ndarray, shape (nights,)
        UTC; NaN gives rows of NaN.

    Returns
    -------
    ndarray, shape (nights, samples, 5)
        Topocentric unit vector in the frame of date, sine of the altitude, illuminated fraction.
    """
    track = np.full((start_mjd.size, _SAMPLES, 5), np.nan)
    known = np.isfinite(start_mjd)
    mjd = np.linspace(start_mjd[known], end_mjd[known], _SAMPLES, axis=1)
    of_date = np.einsum("nij,nkj->nki", to_date[known], ephemeris.moon(mjd))
    meridian = place.seen(of_date, mjd)
    track[known, :, 0:3] = turned(meridian, -place.rotation_angle(mjd))
    track[known, :, 3] = place.sin_altitude(meridian)
    track[known, :, 4] = ephemeris.illumination(mjd)
    return track
