"""The sections of the campaign file, each key with its kind, its example and its usual value.

Usual values are written as an observer would write them and are read like the observer's own.
What depends on other keys (which telescope, how deep) is settled in `build`.
"""

from __future__ import annotations

from typing import Annotated, Any, Generic, TypeVar

from pydantic import AfterValidator, BeforeValidator, Field

from planner.campaign.fields import (
    AUTO,
    Elevation,
    Latitude,
    Longitude,
    Name,
    Night,
    Percent,
    TimeZone,
    auto_or_listed,
    choice,
    counted,
    listed,
    number,
    percent,
    quantity,
    sorted_once,
)
from planner.campaign.sections import Section, needed, usual
from planner.model.disturbance import DISTURBANCES

__all__ = [
    "BANDS", "LINES", "TOP_KEYS", "Airmass", "Band", "Candidates", "CosmologySection",
    "LimitsSection", "MagnitudeValue", "Pause", "ProgrammeSection", "SimulationSection",
    "SiteSection", "SuccessSection", "TelescopeSection", "TimeSection",
]  # fmt: skip

BANDS = ("u", "g", "r", "i", "z", "B", "V", "R")
LINES = ("Hbeta", "Halpha", "MgII", "CIV")
TOP_KEYS = (
    "campaign", "targets", "site", "sites", "telescopes", "streams", "limits", "season_lengths",
    "seasons", "season_shifts", "time", "success", "simulation", "cosmology", "relations",
)  # fmt: skip

GENERATED = "generated for each target from its lag and visible season"
_PAUSE = "a time from 0 s to 12 h, such as 2 min"
_SEASON = "a length from 1 to 366 d, such as 120 d"
_SHIFT = "nights by which seasons start later, from -366 to 366 d, such as 30 d"
_SHARE = "a percentage from 0 to 99, such as 20 %"

Pause = Annotated[float, quantity("s", _PAUSE, lambda v: 0 <= v <= 43200)]
SeasonLength = Annotated[float, quantity("d", _SEASON, lambda v: 1 <= v <= 366)]
SeasonShift = Annotated[float, quantity("d", _SHIFT, lambda v: -366 <= v <= 366)]
Positive = Annotated[float, quantity("", "a percentage above 0, up to 100", lambda v: 0 < v <= 1)]
Airmass = Annotated[float, number("an airmass from 1 to 10, such as 2.0", lambda v: 1 <= v <= 10)]
BRIGHTNESS = "a magnitude from 5 to 30, such as 16.2"
MagnitudeValue = Annotated[float, number(BRIGHTNESS, lambda v: 5 <= v <= 30, "mag")]
Band = Annotated[str, choice(BANDS)]


class ProgrammeSection(Section):
    """``campaign``: name, dates and the seed of the random numbers."""

    name: Name | None = None
    first_night: Night = needed("the evening's date at the site, such as 2027-03-01")
    last_night: Night = needed("the evening's date at the site, such as 2028-10-31")
    seed: Annotated[int, counted("a whole number from 0, such as 4021", 0, 2**53)] = usual(
        "1", "any number will do; keep it and the plan can be repeated"
    )


def _every_month(value: object) -> object:
    """Take one percentage for all months, and say in one sentence which months are missing."""
    months = Months.model_fields
    if isinstance(value, str):
        percent(value)  # refused once, not for each month
        return dict.fromkeys(months, value)
    if isinstance(value, dict) and value.keys() < months.keys():
        missing = ", ".join(month for month in months if month not in value)
        raise ValueError(f"nothing for {missing}; expected all twelve months, or one percentage")
    return value


class Months(Section):
    """Share of clear nights in each month."""

    jan: Percent = needed("a percentage such as 70 %")
    feb: Percent = needed("a percentage such as 70 %")
    mar: Percent = needed("a percentage such as 70 %")
    apr: Percent = needed("a percentage such as 70 %")
    may: Percent = needed("a percentage such as 70 %")
    jun: Percent = needed("a percentage such as 70 %")
    jul: Percent = needed("a percentage such as 70 %")
    aug: Percent = needed("a percentage such as 70 %")
    sep: Percent = needed("a percentage such as 70 %")
    oct: Percent = needed("a percentage such as 70 %")
    nov: Percent = needed("a percentage such as 70 %")
    dec: Percent = needed("a percentage such as 70 %")

    def fractions(self) -> tuple[float, ...]:
        """Return the twelve shares, January first."""
        return tuple(getattr(self, month) for month in Months.model_fields)


class WeatherSection(Section):
    """``weather`` of a site."""

    clear: Annotated[Months, BeforeValidator(_every_month)] = usual("70 %")
    bad_spell: Annotated[
        float, quantity("d", "a length from 1 to 60 nights: 2.5 nights", lambda v: 1 <= v <= 60)
    ] = usual("2.5 nights")


_DarkMag = Annotated[
    float,
    number("magnitudes per square arcsec from 15 to 25: 21.8", lambda v: 15 <= v <= 25, "mag"),
]
_ExtinctionMag = Annotated[
    float, number("magnitudes per airmass from 0 to 3: 0.15", lambda v: 0 <= v <= 3, "mag")
]
Value = TypeVar("Value")


class Bands(Section, Generic[Value]):
    """A value for each band that is known at a site; between them it is interpolated."""

    u: Value | None = None
    g: Value | None = None
    r: Value | None = None
    i: Value | None = None
    z: Value | None = None
    B: Value | None = None
    V: Value | None = None
    R: Value | None = None

    def pairs(self) -> tuple[tuple[str, Value], ...]:
        """Return (band, value) of the bands that were given."""
        given = ((band, getattr(self, band)) for band in BANDS)
        return tuple((band, value) for band, value in given if value is not None)


class SiteSection(Section):
    """``site``, or one of ``sites``."""

    name: Name = needed("a name such as Corran Ridge")
    latitude: Latitude = needed("a latitude, north positive, such as -30.4 deg")
    longitude: Longitude = needed("a longitude, east positive, such as -70.9 deg")
    elevation: Elevation = usual("0 m", "sea level; it hardly matters to a plan")
    time_zone: TimeZone | None = None
    weather: WeatherSection = Field(default={}, validate_default=True)
    seeing: Annotated[
        float, quantity("arcsec", "a width from 0.2 to 10 arcsec", lambda v: 0.2 <= v <= 10)
    ] = usual("1.2 arcsec")
    dark_sky: Bands[_DarkMag] | None = None
    extinction: Bands[_ExtinctionMag] | None = None


class BlockedSection(Section):
    """One run of nights that are not ours; without ``to``, a single night."""

    first: Night = Field(alias="from", json_schema_extra={"expected": "a date"})
    until: Night | None = Field(default=None, alias="to")

    def run(self) -> tuple[int, int]:
        """Return the first and the last night."""
        return self.first, self.first if self.until is None else self.until


def _one_night(value: object) -> object:
    return {"from": value} if isinstance(value, str) else value


_BLOCKED = "dates such as 2027-05-01, or {from: 2027-05-01, to: 2027-05-09}"
_HOURS = "hours above 0 (of a night, at most 24), such as 4"


def _hours(most: float) -> Any:
    """Return the kind of a key whose name says hours: a bare number, or one with ``h``."""
    return number(_HOURS, lambda v: 0 < v <= most, "h")


class TimeSection(Section):
    """``time``: what has been granted on each telescope. Nothing given means no limit."""

    hours: Annotated[float, _hours(1e5)] | None = None
    nights: Annotated[int, counted("a whole number of nights, such as 40", 1, 10000)] | None = None
    hours_per_night: Annotated[float, _hours(24)] | None = None
    least_hours_per_night: Annotated[float, _hours(24)] | None = None
    blocked: Annotated[
        tuple[Annotated[BlockedSection, BeforeValidator(_one_night)], ...], listed(_BLOCKED)
    ] = ()


class TelescopeSection(Section):
    """One of ``telescopes``."""

    name: Name = needed("a name such as C19")
    site: Name | None = None
    aperture: Annotated[
        float, quantity("m", "a diameter from 5 cm to 40 m: 1.9 m", lambda v: 0.05 <= v <= 40)
    ] = needed("the mirror's diameter, such as 1.9 m")
    obstruction: Annotated[
        float, quantity("", "a percentage of the diameter, such as 30 %", lambda v: 0 <= v <= 0.8)
    ] = usual("30 %")
    slew: Pause = usual("1 min")
    acquisition: Pause = usual("1 min")
    technical_loss: Annotated[float, quantity("", _SHARE, lambda v: 0 <= v <= 0.99)] = usual("3 %")
    time: TimeSection | None = None


class LimitsSection(Section):
    """``limits``."""

    airmass: Airmass = usual("2.0")
    twilight: Annotated[str, choice(("civil", "nautical", "astronomical"))] = usual("astronomical")
    moon_separation: Annotated[
        float, quantity("deg", "an angle from 0 to 180 deg: 30 deg", lambda v: 0 <= v <= 180)
    ] = usual("30 deg")


class Candidates(Section):
    """The candidate lists at the top level."""

    season_lengths: Annotated[tuple[SeasonLength, ...], auto_or_listed(_SEASON), sorted_once] = (
        usual(AUTO, GENERATED)
    )
    seasons: Annotated[
        tuple[Annotated[int, counted("a whole number such as 2", 1, 20)], ...],
        auto_or_listed("whole numbers such as [1, 2]"),
        sorted_once,
    ] = usual(AUTO, GENERATED)
    season_shifts: Annotated[tuple[SeasonShift, ...], listed(_SHIFT), sorted_once] = usual(["0 d"])


class SuccessSection(Section):
    """``success``: when a lag is claimed, when it is right, and how often it must be."""

    goal: Annotated[
        float, quantity("", "a percentage from 1 to 99, such as 80 %", lambda v: 0.01 <= v <= 0.99)
    ] = usual("80 %")
    within: Positive = usual("30 %")
    cuts: Annotated[str, choice(("exploratory", "usual", "strict"))] = usual("usual")
    error_below: Positive | None = None
    r_max_above: (
        Annotated[float, number("a correlation from 0 to 1, such as 0.5", lambda v: 0 <= v < 1)]
        | None
    ) = None
    sigma_above: (
        Annotated[float, number("a number from 0 to 10, such as 2", lambda v: 0 <= v <= 10)] | None
    ) = None
    in_peak_above: (
        Annotated[float, quantity("", "a percentage from 0 to 99: 50 %", lambda v: 0 <= v <= 0.99)]
        | None
    ) = None
    false_alarm_below: (
        Annotated[float, quantity("", "a percentage above 0, up to 100: 5 %", lambda v: 0 < v <= 1)]
        | None
    ) = None
    agree: Annotated[str, choice(("yes", "no"))] | None = None
    robust_to: Annotated[
        tuple[Annotated[str, choice(tuple(DISTURBANCES))], ...],
        listed("names of disturbances, such as [outliers, slow trend]"),
        sorted_once,
    ] = ()


_WIDTH = "a percentage of the lag from 0 to 200, such as 50 %"


def _range(values: tuple[float, ...]) -> tuple[float, ...]:
    if len(values) != 2 or values[0] > values[1]:
        raise ValueError("not a range; expected a least and a greatest width: [50 %, 150 %]")
    return values


class SimulationSection(Section):
    """``simulation``."""

    trials: Annotated[
        int, counted("a whole number of trials from 1 to 100000, such as 100", 1, 100000)
    ] = usual("100")
    resamples: Annotated[int, counted("a whole number from 10: 100", 10, 100000)] = usual("100")
    method: Annotated[str, choice(("correlation", "likelihood"))] = usual("correlation")
    detrend: Annotated[str, choice(("yes", "no"))] = usual("no")
    responsivity: Annotated[
        float, number("a number above 0, up to 5, such as 0.8", lambda v: 0 < v <= 5)
    ] = usual("0.8")
    response_width: Annotated[
        tuple[Annotated[float, quantity("", _WIDTH, lambda v: 0 <= v <= 2)], ...],
        listed("[50 %, 150 %]"),
        AfterValidator(_range),
    ] = usual(["50 %", "150 %"])


class CosmologySection(Section):
    """``cosmology``: flat, with a cosmological constant."""

    hubble: Annotated[
        float, quantity("km/(s Mpc)", "such as 70 km/s/Mpc", lambda v: 20 <= v <= 150)
    ] = usual("70 km/s/Mpc", "round values in common use")
    omega_matter: Annotated[
        float, number("a fraction from 0 to 1, such as 0.3", lambda v: 0 < v <= 1)
    ] = usual("0.3", "round values in common use")
