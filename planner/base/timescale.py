"""Time: UTC at the edges, MJD floats inside, nights named by the evening's date.

This is the one place where UT1 = UTC is taken on purpose, and where the time warnings of the
astronomy libraries are kept off the user's screen. Nothing here looks at today's date.
"""

from __future__ import annotations

import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache
from typing import TYPE_CHECKING, Any, overload

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

if TYPE_CHECKING:
    from astropy.utils.iers import IERS

__all__ = ["UT1_NOTE", "date_of_night", "night_of_date", "offline", "tt_of_utc", "utc_text"]

UT1_NOTE = (
    "UT1 is taken equal to UTC and polar motion as zero; the difference stays below 0.9 s by "
    "definition of UTC and moves altitudes by a few arcseconds. Leap seconds not yet announced "
    "are unknown. No Earth-orientation table is read and no network is used."
)
"""What a run says about its time scales."""

_FIRST_LEAP_MJD = 41317.0
"""1972-01-01: UTC has stepped by whole seconds since."""

_MJD_EPOCH = np.datetime64("1858-11-17", "s")


@contextmanager
def offline() -> Iterator[None]:
    """Let astropy and astroplan work with UT1 = UTC, without network, tables or time warnings.

    Inside the block every conversion to UT1 uses zero for UT1 - UTC and for polar motion, whatever
    the date, and no table is too old; on leaving, astropy's own settings are back. Two messages
    alone are silenced: ERFA's "dubious year", which says that leap seconds to come are unknown (see
    `UT1_NOTE`), and the page-long one that separations from a moon seen from the site depend on
    the frame they are taken in. Not safe to enter from several threads at once, since Python's
    warning filters belong to the process.
    """
    from astropy.utils import iers

    with (
        warnings.catch_warnings(),
        iers.conf.set_temp("auto_download", False),
        iers.conf.set_temp("auto_max_age", None),
        iers.earth_orientation_table.set(_zero_table()),
    ):
        warnings.filterwarnings(
            "ignore", message=r'ERFA function "\w+" yielded (\d+ of )?"dubious year \(Note \d\)"$'
        )
        warnings.filterwarnings("ignore", message="transforming other coordinates from <")
        yield


@cache
def _zero_table() -> IERS:
    """Return an Earth-orientation table of zeros for all dates since 1972."""
    from astropy import units as u
    from astropy.utils import iers

    zeros = np.zeros(2)
    columns: dict[str, Any] = {
        "MJD": [_FIRST_LEAP_MJD, 200_000.0] * u.d,
        "UT1_UTC": zeros * u.s,
        "PM_x": zeros * u.arcsec,
        "PM_y": zeros * u.arcsec,
    }
    return iers.IERS(columns)


def tt_of_utc(utc_mjd: ArrayLike) -> NDArray[np.float64]:
    """Return terrestrial time of UTC, both as MJD, with the leap seconds known to ERFA.

    TT = UTC + (TAI - UTC) + 32.184 s; after the last known leap second the offset stays.

    Raises
    ------
    ValueError
        For dates before 1972, when UTC did not yet step by whole seconds.
    """
    utc_mjd = np.asarray(utc_mjd, dtype=np.float64)
    if utc_mjd.size and utc_mjd.min() < _FIRST_LEAP_MJD:
        raise ValueError("dates before 1972-01-01 are not supported")
    table = erfa.leap_seconds.get()
    _, since_mjd = erfa.cal2jd(table["year"], table["month"], 1)
    step = np.searchsorted(since_mjd, utc_mjd, side="right") - 1
    return np.asarray(utc_mjd + (table["tai_utc"][step] + 32.184) / 86400.0)


def night_of_date(date: str) -> int:
    """Return the integer MJD of an ISO date such as ``"2027-03-01"``."""
    days = np.datetime64(date, "D") - _MJD_EPOCH.astype("datetime64[D]")
    return int(days.astype(np.int64))


def date_of_night(night: int) -> str:
    """Return the ISO date of an integer MJD."""
    return str(_MJD_EPOCH.astype("datetime64[D]") + int(night))


@overload
def utc_text(utc_mjd: float) -> str: ...
@overload
def utc_text(utc_mjd: NDArray[np.float64]) -> NDArray[np.str_]: ...
def utc_text(utc_mjd: float | NDArray[np.float64]) -> str | NDArray[np.str_]:
    """Return ``YYYY-MM-DDTHH:MM:SSZ`` of UTC given as MJD, rounded to the nearest second.

    An array gives an array of the same shape; NaN (no such time) gives an empty text.
    """
    mjd = np.asarray(utc_mjd, dtype=np.float64)
    known = np.isfinite(mjd)
    seconds = np.rint(np.where(known, mjd, 0.0) * 86400.0).astype(np.int64)
    iso = np.datetime_as_string(_MJD_EPOCH + seconds.astype("timedelta64[s]"))
    text = np.where(known, np.char.add(iso, "Z"), "")
    return text if text.ndim else str(text)
