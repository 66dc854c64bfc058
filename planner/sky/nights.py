"""Nights: when the sun is down, and how much moon there is."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from planner.model.observatory import Limits, Site
from planner.model.sky import Nights, NightState
from planner.sky.ephemeris import Ephemeris
from planner.sky.local import Place
from planner.sky.moon import moon_track

__all__ = ["nights_at"]

Floats = NDArray[np.float64]
Height = Callable[[Floats], Floats]

_SUN_SAMPLES = 73
_BISECTIONS = 26
"""Halvings of half a day: to better than a millisecond."""


def nights_at(site: Site, first_night: int, last_night: int, limits: Limits) -> Nights:
    """Return every night from `first_night` to `last_night`, both included.

    Parameters
    ----------
    site : Site
        Observatory.
    first_night, last_night : int
        MJD of the evening dates.
    limits : Limits
        Only the sun's upper altitude limit is used.

    Returns
    -------
    Nights
        A night lasts from local mean solar noon, ``night + 0.5 - longitude / 360`` in UTC, to the
        next, so no civil time or daylight saving enters. It is dark while the sun's centre,
        topocentric and without refraction, is below the limit.

    Raises
    ------
    ValueError
        If `last_night` lies before `first_night`, or dates before 1972.

    Notes
    -----
    Near the poles the dark time can be cut by noon, which then is its start or end, and can fall
    into two pieces between one noon and the next: the piece that holds the sun's lowest point is
    the night's. The lowest point itself is computed, not sampled, so that nights of a few minutes
    are found.
    """
    if last_night < first_night:
        raise ValueError("the last night must not lie before the first")
    night = np.arange(first_night, last_night + 1, dtype=np.int64)
    noon = np.asarray(night + 0.5 - site.longitude_deg / 360.0, dtype=np.float64)
    ephemeris = Ephemeris.over(noon[0], noon[-1] + 1.0)
    place = Place.of(site)

    def sun_height(mjd: Floats) -> Floats:
        """Sine of the sun's altitude less that of its limit: negative in the dark."""
        of_date = np.einsum("...ij,...j->...i", ephemeris.to_date(mjd), ephemeris.sun(mjd))
        limit = np.sin(np.radians(limits.sun_altitude_deg))
        return np.asarray(place.sin_altitude(place.seen(of_date, mjd)) - limit)

    state, start, end = _dark_time(sun_height, noon)
    moon_height = moon_track(place, ephemeris, ephemeris.to_date(noon + 0.5), start, end)[..., 3]
    return Nights(
        site=site.name,
        night=night,
        noon_mjd=noon,
        state=state,
        dark_start_mjd=start,
        dark_end_mjd=end,
        moon_illumination=ephemeris.illumination(noon + 0.5),
        moon_up_fraction=np.where(state == NightState.NONE, 0.0, _share_above_zero(moon_height)),
    )


def _dark_time(height: Height, noon: Floats) -> tuple[NDArray[np.int8], Floats, Floats]:
    """Return state, start and end of the dark piece that holds the sun's lowest point."""
    low, before, after = _turning_points(height, noon)
    is_dark = height(low) < 0.0
    always = is_dark & (np.maximum(height(before), height(after)) < 0.0)
    start = np.where(height(before) < 0.0, noon, _crossing(height, low, before))
    end = np.where(height(after) < 0.0, noon + 1.0, _crossing(height, low, after))
    state = np.where(always, NightState.ALWAYS, np.where(is_dark, NightState.ORDINARY, 0))
    return (
        state.astype(np.int8),
        np.where(is_dark, start, np.nan),
        np.where(is_dark, end, np.nan),
    )


def _turning_points(height: Height, noon: Floats) -> tuple[Floats, Floats, Floats]:
    """Return the times of the sun's lowest point and of its highest before and after it."""
    mjd = np.linspace(noon, noon + 1.0, _SUN_SAMPLES, axis=1)
    sampled = height(mjd)
    index = np.arange(_SUN_SAMPLES)
    lowest = np.argmin(sampled, axis=1)[:, None]
    evening = np.argmax(np.where(index <= lowest, sampled, -np.inf), axis=1)
    morning = np.argmax(np.where(index >= lowest, sampled, -np.inf), axis=1)
    low = _vertex(lambda t: -height(t), mjd, -sampled, lowest[:, 0])
    return low, _vertex(height, mjd, sampled, evening), _vertex(height, mjd, sampled, morning)


def _vertex(height: Height, mjd: Floats, sampled: Floats, highest: NDArray[np.intp]) -> Floats:
    """Return the time of the maximum next to each row's sample `highest`, inside the row's span.

    Top of the parabola through three samples, 20 minutes apart, if it is higher than the sample.
    """
    row = np.arange(mjd.shape[0])
    middle = np.clip(highest, 1, mjd.shape[1] - 2)
    left, here, right = (sampled[row, middle + k] for k in (-1, 0, 1))
    bend = left - 2.0 * here + right
    shift = np.divide(0.5 * (left - right), bend, out=np.zeros_like(bend), where=bend != 0.0)
    step = mjd[:, 1] - mjd[:, 0]
    top = np.clip(mjd[row, middle] + np.clip(shift, -1.0, 1.0) * step, mjd[:, 0], mjd[:, -1])
    best = mjd[row, highest]
    return np.where(height(top) > sampled[row, highest], top, best)


def _crossing(height: Height, below: Floats, above: Floats) -> Floats:
    """Return the times between `below` and `above` at which the height is zero, by bisection."""
    for _ in range(_BISECTIONS):
        middle = 0.5 * (below + above)
        down = height(middle) < 0.0
        below, above = np.where(down, middle, below), np.where(down, above, middle)
    return below


def _share_above_zero(height: Floats) -> Floats:
    """Return the share of each row's span with height > 0, straight lines between samples."""
    left, right = height[:, :-1], height[:, 1:]
    above = np.maximum(left, 0.0) + np.maximum(right, 0.0)
    return np.asarray(np.mean(above / (abs(left) + abs(right)), axis=1))
