"""Windows: when each target can be observed in each night."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels.sky_windows import target_windows
from planner.model.observatory import Limits, Site
from planner.model.sky import Nights, Windows
from planner.sky.ephemeris import Ephemeris
from planner.sky.local import Place, unit_vectors
from planner.sky.moon import moon_track

__all__ = ["windows_of"]

_SHORTEST_D = 1.0 / 1440.0
"""Windows shorter than a minute are not worth a row."""

_MOON_MOTION_DEG = 12.0
"""More than the topocentric moon moves in half a day: at most 12 h x 0.65 deg/h + 2 x 1 deg."""


def windows_of(
    ra_deg: ArrayLike, dec_deg: ArrayLike, site: Site, nights: Nights, limits: Limits
) -> Windows:
    """Return all windows of a list of targets.

    Parameters
    ----------
    ra_deg, dec_deg : array_like, shape (targets,)
        ICRS.
    site : Site
        The observatory `nights` was made for.
    nights : Nights
        From `nights_at`, with the same sun limit.
    limits : Limits
        Airmass and moon limits.

    Returns
    -------
    Windows
        The longest stretches of each night's dark time in which the airmass is at or below its
        limit and the moon is below the horizon or at least `moon_separation_deg` away. Airmass
        is sec z without refraction (astropy's ``secz``), so its limit is one of altitude,
        asin(1 / airmass). The moon is topocentric, its horizon that of its centre. Windows of
        less than a minute are dropped; a target without windows has no rows. A moon that shows
        itself over the horizon, or comes inside the circle, for less than a quarter of an hour (by
        some 0.03 degrees) may be overlooked.

    Raises
    ------
    ValueError
        For coordinates out of range, an airmass limit below 1, or nights of another site.
    """
    if not limits.airmass >= 1.0:
        raise ValueError("the airmass limit must be at least 1")
    if nights.site != site.name:
        raise ValueError(f"these nights belong to {nights.site}, not to {site.name}")
    directions = np.atleast_2d(unit_vectors(ra_deg, dec_deg))
    tables = _night_tables(site, nights)
    found = [_of_one(direction, tables, limits) for direction in directions]
    rows = np.concatenate([row for _, row in found]) if found else np.empty((0, 7))
    counts = [night.size for night, _ in found]
    return Windows(
        site=site.name,
        target=np.repeat(np.arange(len(found), dtype=np.int32), counts),
        night=np.concatenate([np.empty(0, np.int32), *(night for night, _ in found)]),
        start_mjd=rows[:, 0].copy(),
        end_mjd=rows[:, 1].copy(),
        best_mjd=rows[:, 2].copy(),
        airmass_min=1.0 / rows[:, 3],
        moon_separation_deg=np.degrees(np.arccos(np.clip(rows[:, 4], -1.0, 1.0))),
        moon_altitude_deg=np.degrees(np.arcsin(np.clip(rows[:, 5], -1.0, 1.0))),
        moon_illumination=rows[:, 6].copy(),
    )


def _night_tables(site: Site, nights: Nights) -> tuple[Any, ...]:
    """Return what every target needs of the nights, in the order of the kernel's arguments."""
    place = Place.of(site)
    start, end = nights.dark_start_mjd, nights.dark_end_mjd
    ephemeris = Ephemeris.over(nights.noon_mjd[0], nights.noon_mjd[-1] + 1.0)
    # one apparent place of a target serves the whole night: it moves by 0.3 arcsec in half a day
    midnight = nights.noon_mjd + 0.5
    to_date = ephemeris.to_date(midnight)
    return (
        np.ascontiguousarray(ephemeris.velocity(midnight)),
        to_date,
        start,
        end,
        place.rotation_angle(np.where(np.isfinite(start), start, nights.noon_mjd)),
        moon_track(place, ephemeris, to_date, start, end),
        place.sin_latitude,
        place.cos_latitude,
    )


def _of_one(
    direction: NDArray[np.float64],
    tables: tuple[Any, ...],
    limits: Limits,
) -> tuple[NDArray[np.int32], NDArray[np.float64]]:
    """Return the nights and rows of one target's windows."""
    separation = math.radians(limits.moon_separation_deg)
    clear = min(math.radians(limits.moon_separation_deg + _MOON_MOTION_DEG), math.pi)
    rules = (1.0 / limits.airmass, math.cos(separation), math.cos(clear), _SHORTEST_D)
    capacity = len(tables[0])
    while True:
        night, rows = np.empty(capacity, np.int32), np.empty((capacity, 7))
        count = target_windows(direction, *tables, *rules, night, rows)
        if count <= capacity:
            return night[:count].copy(), rows[:count].copy()
        capacity = count
