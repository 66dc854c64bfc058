"""Windows of one target: hour angles in closed form, the moon's limits by bisection.

Throughout, (x, y, z) is the target's apparent place as a unit vector in the frame of date, and
`track` the moon through one night, (samples, 5): topocentric unit vector in the same frame, sine
of the altitude, illuminated fraction, at even spacing; a position in it is counted in samples.
"""

# mypy: allow-untyped-defs
# (the compiler infers the types)

from __future__ import annotations

import math

import numpy as np
from numba import njit

__all__ = ["target_windows"]

_TURN = 2.0 * math.pi
_SIDEREAL_DAY = 1.0 / 1.00273781191135448
"""Days of UT1 in one turn of the Earth (Capitaine et al. 2000, IAU Resolution B1.8)."""


@njit(cache=True, nogil=True)
def _place(direction, velocity, to_date):
    """Apparent place: aberration to first order, then precession and nutation."""
    a, b, c = direction[0] + velocity[0], direction[1] + velocity[1], direction[2] + velocity[2]
    length = math.sqrt(a * a + b * b + c * c)
    x = (to_date[0, 0] * a + to_date[0, 1] * b + to_date[0, 2] * c) / length
    y = (to_date[1, 0] * a + to_date[1, 1] * b + to_date[1, 2] * c) / length
    z = (to_date[2, 0] * a + to_date[2, 1] * b + to_date[2, 2] * c) / length
    return x, y, z


@njit(cache=True, nogil=True)
def _at(track, position, column):
    """Cubic through the four samples around `position`."""
    first = min(max(int(position) - 1, 0), track.shape[0] - 4)
    a = position - first
    b, c, d = a - 1.0, a - 2.0, a - 3.0
    return (
        -b * c * d / 6.0 * track[first, column]
        + a * c * d / 2.0 * track[first + 1, column]
        - a * b * d / 2.0 * track[first + 2, column]
        + a * b * c / 6.0 * track[first + 3, column]
    )


@njit(cache=True, nogil=True)
def _cosine(track, position, x, y, z):
    """Cosine of the distance between target and moon."""
    return x * _at(track, position, 0) + y * _at(track, position, 1) + z * _at(track, position, 2)


@njit(cache=True, nogil=True)
def _is_free(track, position, x, y, z, cos_separation):
    """Whether the moon is far enough or below the horizon."""
    return _cosine(track, position, x, y, z) <= cos_separation or _at(track, position, 3) <= 0.0


@njit(cache=True, nogil=True)
def _change(track, left, right, x, y, z, cos_separation):
    """Position between `left` and `right` at which `_is_free` changes."""
    left_is_free = _is_free(track, left, x, y, z, cos_separation)
    for _ in range(40):
        middle = 0.5 * (left + right)
        if _is_free(track, middle, x, y, z, cos_separation) == left_is_free:
            left = middle
        else:
            right = middle
    return 0.5 * (left + right)


@njit(cache=True, nogil=True)
def _spans(begin, finish, transit, mean, swing, sin_altitude, spans):
    """Write the spans of [begin, finish] with altitude above the limit; return their number.

    The sine of the altitude is mean + swing * cos(hour angle); `transit` is the upper transit
    nearest to `begin`.
    """
    if mean + swing < sin_altitude:
        return 0
    if mean - swing >= sin_altitude:
        spans[0, 0], spans[0, 1] = begin, finish
        return 1
    half = math.acos((sin_altitude - mean) / swing) / _TURN * _SIDEREAL_DAY
    for k in range(3):
        spans[k, 0] = max(begin, transit + k * _SIDEREAL_DAY - half)
        spans[k, 1] = min(finish, transit + k * _SIDEREAL_DAY + half)
    return 3


@njit(cache=True, nogil=True)
def _cut(track, begin, per_day, start, end, x, y, z, cos_separation, pieces):
    """Write the pieces of [start, end] in which the moon does not disturb; return their number."""
    count = 0
    opened = start
    left = (start - begin) * per_day
    stop = (end - begin) * per_day
    free = _is_free(track, left, x, y, z, cos_separation)
    while left < stop:
        right = min(math.floor(left) + 1.0, stop)
        if _is_free(track, right, x, y, z, cos_separation) != free:
            change = begin + _change(track, left, right, x, y, z, cos_separation) / per_day
            if free:
                pieces[count, 0], pieces[count, 1] = opened, change
                count += 1
            opened = change
            free = not free
        left = right
    if free:
        pieces[count, 0], pieces[count, 1] = opened, end
        count += 1
    return count


@njit(cache=True, nogil=True)
def _highest(start, end, transit):
    """Time of greatest altitude in [start, end]: an upper transit, or one of the ends."""
    after = transit + _SIDEREAL_DAY * math.ceil((start - transit) / _SIDEREAL_DAY)
    if after <= end:
        return after
    rising = math.cos((end - transit) / _SIDEREAL_DAY * _TURN)
    return end if rising > math.cos((start - transit) / _SIDEREAL_DAY * _TURN) else start


@njit(cache=True, nogil=True)
def _describe(row, start, end, transit, mean, swing, track, begin, per_day, x, y, z):
    """Fill one row of the result."""
    best = _highest(start, end, transit)
    position = (best - begin) * per_day
    row[0], row[1], row[2] = start, end, best
    row[3] = mean + swing * math.cos((best - transit) / _SIDEREAL_DAY * _TURN)
    row[4] = _cosine(track, position, x, y, z)
    row[5] = _at(track, position, 3)
    row[6] = _at(track, position, 4)


@njit(cache=True, nogil=True)
def target_windows(
    direction,
    velocity,
    to_date,
    dark_start,
    dark_end,
    start_angle,
    moon,
    sin_latitude,
    cos_latitude,
    sin_altitude,
    cos_separation,
    cos_clear,
    shortest_d,
    night_out,
    rows_out,
):
    """Write the windows of one target, in time order; return how many there are.

    Parameters
    ----------
    direction : (3,) ICRS unit vector of the target
    velocity : (nights, 3) of the Earth, units of the speed of light
    to_date : (nights, 3, 3) rotation from the GCRS to the frame of date
    dark_start, dark_end : (nights,) days, at most one day apart; NaN without a night
    start_angle : (nights,) local Earth rotation angle at `dark_start`, rad
    moon : (nights, samples >= 4, 5) tracks over the dark time, both ends included
    sin_latitude, cos_latitude : of the site, geodetic
    sin_altitude : lower limit of the target
    cos_separation : cosine of the least distance from a moon above the horizon
    cos_clear : cosine of a distance in the middle of the night beyond which the moon cannot come
        within the limit that night; -1: look at every sample
    shortest_d : shorter windows are dropped
    night_out : (capacity,) int32, row of the night
    rows_out : (capacity, 7) start, end, time of greatest altitude; at that time sine of the
        altitude, cosine of the moon's distance, sine of the moon's altitude, illuminated fraction

    Returns
    -------
    int
        The number of windows; only the first `capacity` of them are written.

    The moon is looked at sample by sample: an interruption between two samples, in which it passes
    its limit by a hair, is overlooked.
    """
    count = 0
    samples = moon.shape[1]
    spans = np.empty((3, 2))
    pieces = np.empty((samples + 1, 2))
    for n in range(dark_start.size):
        begin, finish, track = dark_start[n], dark_end[n], moon[n]
        if not finish > begin:
            continue
        x, y, z = _place(direction, velocity[n], to_date[n])
        mean, swing = sin_latitude * z, cos_latitude * math.sqrt(x * x + y * y)
        hour_angle = start_angle[n] - math.atan2(y, x)
        hour_angle -= _TURN * math.floor(hour_angle / _TURN + 0.5)
        transit = begin - hour_angle / _TURN * _SIDEREAL_DAY
        per_day = (samples - 1) / (finish - begin)
        is_clear = _cosine(track, (samples - 1) // 2, x, y, z) < cos_clear
        for k in range(_spans(begin, finish, transit, mean, swing, sin_altitude, spans)):
            start, end = spans[k, 0], spans[k, 1]
            if end - start < shortest_d:
                continue
            pieces[0, 0], pieces[0, 1] = start, end
            found = 1
            if not is_clear:
                found = _cut(track, begin, per_day, start, end, x, y, z, cos_separation, pieces)
            for p in range(found):
                start, end = pieces[p, 0], pieces[p, 1]
                if end - start < shortest_d:
                    continue
                if count < rows_out.shape[0]:
                    night_out[count] = n
                    row = rows_out[count]
                    _describe(row, start, end, transit, mean, swing, track, begin, per_day, x, y, z)
                count += 1
    return count
