"""The kinds of value that stand in the file. The schema, not YAML, decides what a text means.

Each kind is a float, int or str together with the function that reads it from text; the
function's refusal says what was found and what is expected.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import date
from typing import Annotated, Any, TypeVar

from pydantic import AfterValidator, BeforeValidator, ValidationInfo

from planner.base import quantities
from planner.base.quantities import shown
from planner.campaign import angles
from planner.campaign.sections import nearest

__all__ = [
    "MJD_OF_DATE_ZERO",
    "Declination",
    "Elevation",
    "Latitude",
    "Longitude",
    "Name",
    "Night",
    "Percent",
    "RightAscension",
    "Text",
    "TimeZone",
    "choice",
    "counted",
    "listed",
    "number",
    "percent",
    "quantity",
    "read_text",
    "sorted_once",
]

MJD_OF_DATE_ZERO = 678576
"""Ordinal of a date minus its Modified Julian Date."""

Read = TypeVar("Read")


def read_text(read: Callable[[str], Read], expected: str) -> BeforeValidator:
    """Return a validator that applies `read` to text and refuses lists and sections."""

    def validate(value: object) -> Read:
        if not isinstance(value, str):
            kinds: dict[type, str] = {list: "a list", dict: "a section"}
            raise ValueError(f"{kinds.get(type(value), 'nothing')}; expected {expected}")
        return read(value)

    return BeforeValidator(validate)


def quantity(unit: str, expected: str, allowed: Callable[[float], bool]) -> BeforeValidator:
    """Return a validator of a number with unit; the float comes out in `unit`."""
    return read_text(
        lambda text: _allowed(quantities.in_unit(text, unit, expected), text, expected, allowed),
        expected,
    )


def number(expected: str, allowed: Callable[[float], bool], unit: str = "") -> BeforeValidator:
    """Return a validator of a bare number, which may also carry `unit` (a word, such as mag)."""

    def read(text: str) -> float:
        value, found = quantities.split(text, expected)
        if found and found != unit:
            raise ValueError(f"{shown(text)} is not a bare number; expected {expected}")
        return _allowed(value, text, expected, allowed)

    return read_text(read, expected)


def counted(expected: str, least: int, most: int) -> BeforeValidator:
    """Return a validator of a whole number from `least` to `most`."""

    def read(text: str) -> int:
        value = quantities.plain_number(text, expected)
        if not value.is_integer():
            raise ValueError(f"{shown(text)} is not a whole number; expected {expected}")
        return int(_allowed(value, text, expected, lambda v: least <= v <= most))

    return read_text(read, expected)


def choice(known: tuple[str, ...]) -> BeforeValidator:
    """Return a validator of one of the known words; case, spaces and dashes do not matter."""
    expected = f"one of {', '.join(known)}"

    def bare(word: str) -> str:
        return re.sub(r"[\s_-]", "", word).lower()

    # Bands differ by case alone (R and r), so the word as written comes first.
    spelled = {bare(k): k for k in known} if len({bare(k) for k in known}) == len(known) else {}

    def read(text: str) -> str:
        if text in known:
            return text
        if bare(text) in spelled:
            return spelled[bare(text)]
        guess = nearest(text, known) if spelled else ""
        hint = f", did you mean `{guess}`?" if guess else ""
        raise ValueError(f"{shown(text)} is not known{hint}; expected {expected}")

    return read_text(read, expected)


def listed(expected: str) -> BeforeValidator:
    """Return a validator that takes one value or a list of them as a tuple."""

    def as_tuple(value: object) -> tuple[Any, ...]:
        if isinstance(value, list | tuple):
            if not value:
                raise ValueError(f"an empty list; expected {expected}")
            return tuple(value)
        if not isinstance(value, str):
            raise ValueError(f"a section; expected {expected}")
        return (value,)

    return BeforeValidator(as_tuple)


AUTO = "auto"
"""Left to the planner, which finds a value for each target."""


def auto_or_listed(expected: str) -> BeforeValidator:
    """Return a validator like `listed` that takes ``auto`` as an empty tuple."""
    as_tuple = listed(f"{expected}, or {AUTO}").func

    def take(value: object) -> Any:
        return () if value == AUTO else as_tuple(value)  # type: ignore[call-arg]

    return BeforeValidator(take)


def _once(values: tuple[Any, ...]) -> tuple[Any, ...]:
    if len(set(values)) < len(values):
        raise ValueError("a value is given twice; expected each value once")
    return tuple(sorted(values))


sorted_once = AfterValidator(_once)
"""Refuses repeated values and sorts the others."""


def _allowed(value: float, text: str, expected: str, allowed: Callable[[float], bool]) -> float:
    if not allowed(value):
        raise ValueError(f"{shown(text)} is out of range; expected {expected}")
    return value


_NIGHT = "the evening's date at the site, such as 2027-03-01"
_DATE = re.compile(
    r"(?P<date>[0-9]{4}-[0-9]{2}-[0-9]{2})"
    r"(?:[Tt\s]+(?P<hour>[0-9]{1,2}):(?P<rest>[0-5][0-9](?::[0-5][0-9](?:\.[0-9]*)?)?))?"
)


def _night(value: object, info: ValidationInfo) -> int:
    """Read the MJD of an evening date.

    A local time may stand behind the date: from noon on it belongs to that evening, before noon
    to the evening before; midnight exactly is what spreadsheets write behind a plain date. A note
    says what was read. A time with a zone is refused: it does not tell the evening at the site.
    """
    text = value.strip() if isinstance(value, str) else ""
    match = _DATE.fullmatch(text)
    try:
        day = date.fromisoformat(match["date"]).toordinal() - MJD_OF_DATE_ZERO if match else None
    except ValueError:
        day = None
    if match is None or day is None or not 15020 <= day < 88069:  # 1900 to 2099
        found = shown(text) if isinstance(value, str) else "no date"
        raise ValueError(f"{found} is not a date; expected {_NIGHT}")
    if match["hour"] is None:
        return day
    hour, midnight = int(match["hour"]), not match["rest"].strip("0:.") and int(match["hour"]) == 0
    if hour > 23:
        raise ValueError(f"{shown(text)} is not a time of day; expected {_NIGHT}")
    night = day if midnight or hour >= 12 else day - 1
    evening = date.fromordinal(night + MJD_OF_DATE_ZERO).isoformat()
    if info.context:
        info.context["notes"].append(
            f"{info.context['where']}: {text} is read as local time in the night that begins in "
            f"the evening of {evening}"
        )
    return night


def _text(text: str) -> str:
    if not text.isprintable():
        raise ValueError(f"{shown(text)} holds line breaks or control characters; expected a word")
    return text.strip()


def _name(text: str) -> str:
    name = _text(text)
    if not 0 < len(name) <= 80:
        raise ValueError(f"{shown(text)}; expected a name of 1 to 80 characters")
    return name


def _time_zone(text: str) -> str:
    import zoneinfo

    known = zoneinfo.available_timezones()  # empty on a machine without the zone tables
    if known and text not in known:
        guess = nearest(text, known)
        hint = f", did you mean `{guess}`?" if guess else ""
        raise ValueError(f"{shown(text)} is not known{hint}; expected a zone: America/Santiago")
    return text


_PERCENT = "a percentage from 0 to 100, such as 30 %"


def percent(text: str) -> float:
    """Return the share that a percentage means. Raises ValueError."""
    share = quantities.in_unit(text, "", _PERCENT)
    return _allowed(share, text, _PERCENT, lambda v: 0 <= v <= 1)


_HEIGHT = "a height from -500 m to 9 km, such as 2300 m"

Night = Annotated[int, BeforeValidator(_night)]
"""MJD of an evening date."""
Name = Annotated[str, read_text(_name, "a name")]
Text = Annotated[str, read_text(lambda text: _text(" ".join(text.split())), "a text")]
TimeZone = Annotated[str, read_text(_time_zone, "a zone such as America/Santiago")]
Percent = Annotated[float, read_text(percent, _PERCENT)]
Elevation = Annotated[float, quantity("m", _HEIGHT, lambda v: -500 <= v <= 9000)]
RightAscension = Annotated[float, read_text(angles.right_ascension, "such as 12:30:45")]
Declination = Annotated[float, read_text(angles.declination, "such as -05:23:28")]
Latitude = Annotated[float, read_text(angles.latitude, "such as -30.4 deg")]
Longitude = Annotated[float, read_text(angles.longitude, "such as -70.9 deg")]
