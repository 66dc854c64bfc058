"""The sky over a site: nights, windows, seasons, and where targets, sun and moon stand.

In: a site, limits, ICRS coordinates in degrees, nights as MJD of the evening date.
Out: records of nights, windows and seasons, or arrays of angles and of sky brightness; times are
UTC as MJD.
Nothing asks the network, reads Earth-orientation tables or depends on today's date.
Not for spacecraft or solar-system targets: a target is a fixed direction.
"""

from planner.sky.brightness import dark_ab_mag_at, extinction_at, sky_ab_mag, sky_at
from planner.sky.nights import nights_at
from planner.sky.observers import constraints, observer
from planner.sky.positions import (
    Positions,
    SunMoon,
    airmass_of,
    moon_separation,
    positions_at,
    sun_moon_at,
)
from planner.sky.seasons import seasons_of
from planner.sky.windows import windows_of

__all__ = [
    "Positions",
    "SunMoon",
    "airmass_of",
    "constraints",
    "dark_ab_mag_at",
    "extinction_at",
    "moon_separation",
    "nights_at",
    "observer",
    "positions_at",
    "seasons_of",
    "sky_ab_mag",
    "sky_at",
    "sun_moon_at",
    "windows_of",
]
