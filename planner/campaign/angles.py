"""Right ascension, declination, latitude and longitude as observers write them."""

from __future__ import annotations

import re

from planner.base.quantities import in_unit, shown, split

__all__ = ["declination", "latitude", "longitude", "right_ascension"]

_PARTS = re.compile(
    r"(?P<sign>[+-]?)\s*(?P<a>[0-9]{1,3})\s*(?P<mark>[:hd°]|\s)\s*(?P<b>[0-9]{1,2})"
    r"(?:\s*[:m'′\s]\s*(?P<c>[0-9]{1,2}(?:\.[0-9]*)?)\s*(?:s|\"|″|'')?|\s*[m'′])?"
)
_HOURS = re.compile(r"[0-9.]+\s*(?:h|hr|hour|hours|hourangle)")

_RA = (
    "a right ascension from 0 to 24 h, such as 12:30:45.6, 12h30m45s or 187.69 deg",
    "minutes and seconds below 60, such as 12:30:45.6",
)
_DEC = (
    "a declination from -90 to 90 deg, such as -05:23:28 or -5.391 deg",
    "minutes and seconds below 60, such as -05:23:28",
)
_LATITUDE = ("a latitude from -90 to 90 deg, north positive, such as -30.4 deg", _DEC[1])
_LONGITUDE = ("a longitude from -180 to 360 deg, east positive, such as -70.9 deg", _DEC[1])


def right_ascension(text: str) -> float:
    """Return degrees in [0, 360). Sexagesimal text is hours unless marked with ``d`` or ``°``.

    Raises
    ------
    ValueError
        With what was found and what is expected.
    """
    expected, sixty = _RA
    if _HOURS.fullmatch(text.strip()):
        degrees = split(text, expected)[0] * 15.0
    else:
        degrees = _degrees(text, expected, sixty, hours=True)
    return _within(degrees, 0.0, 360.0, text, expected, open_end=True)


def declination(text: str) -> float:
    """Return degrees in [-90, 90]. Raises ValueError."""
    return _within(_degrees(text, *_DEC), -90.0, 90.0, text, _DEC[0])


def latitude(text: str) -> float:
    """Return degrees in [-90, 90], north positive. Raises ValueError."""
    return _within(_degrees(text, *_LATITUDE), -90.0, 90.0, text, _LATITUDE[0])


def longitude(text: str) -> float:
    """Return degrees in [-180, 180), east positive; 180 to 360 is brought there.

    Raises
    ------
    ValueError
        With what was found and what is expected.
    """
    degrees = _within(_degrees(text, *_LONGITUDE), -180.0, 360.0, text, _LONGITUDE[0])
    return degrees - 360.0 if degrees >= 180.0 else degrees


def _degrees(text: str, expected: str, sixty: str, *, hours: bool = False) -> float:
    """Return degrees from sexagesimal text or a number with unit."""
    match = _PARTS.fullmatch(text.strip().replace("−", "-"))
    if match is None:
        return in_unit(text, "deg", expected)
    if match["mark"] == "h" and not hours:
        raise ValueError(f"{shown(text)} is in hours; expected {expected}")
    minutes, seconds = float(match["b"]), float(match["c"] or 0.0)
    if minutes >= 60.0 or seconds >= 60.0:
        raise ValueError(f"{shown(text)} has minutes or seconds of 60 or more; expected {sixty}")
    size = (float(match["a"]) * 3600.0 + minutes * 60.0 + seconds) / 3600.0
    scale = 15.0 if hours and match["mark"] not in "d°" else 1.0
    return (-size if match["sign"] == "-" else size) * scale


def _within(
    degrees: float, low: float, high: float, text: str, expected: str, *, open_end: bool = False
) -> float:
    if not low <= degrees <= high or (open_end and degrees == high):
        raise ValueError(f"{shown(text)} is out of range; expected {expected}")
    return degrees
