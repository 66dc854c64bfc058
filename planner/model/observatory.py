"""Sites, telescopes and the two streams."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Instrument", "Limits", "Site", "Stream", "Telescope", "TimeAllotment", "WeatherClimate"]


@dataclass(frozen=True, slots=True)
class WeatherClimate:
    """How often a site is clear, and how long bad weather lasts."""

    clear_fraction: tuple[float, ...]
    """Share of usable nights in each month, January first; 12 values in [0, 1]."""
    bad_spell_nights: float
    """Mean length of a run of lost nights, >= 1."""


@dataclass(frozen=True, slots=True)
class Site:
    """A place with a telescope."""

    name: str
    latitude_deg: float
    """Geodetic, north positive."""
    longitude_deg: float
    """East positive, -180 to 180."""
    elevation_m: float
    time_zone: str | None
    """IANA name, only for a second, labelled column; nothing is computed with it."""
    weather: WeatherClimate


@dataclass(frozen=True, slots=True)
class TimeAllotment:
    """What the observer has been, or hopes to be, granted on one telescope."""

    hours: float | None = None
    """Clock hours over the whole campaign; None: no cap."""
    nights: int | None = None
    """Nights on which the telescope may be used; None: no cap."""
    hours_per_night: float | None = None
    """Clock hours in one night; None: the whole night."""
    blocked: tuple[tuple[int, int], ...] = ()
    """Runs of nights not ours, each (first, last) inclusive, as the MJD of the evening date."""


@dataclass(frozen=True, slots=True)
class Telescope:
    """One telescope at one site."""

    name: str
    site: str
    aperture_m: float
    slew_s: float
    """Slew and acquisition time spent on each visit besides exposure and read-out."""
    time: TimeAllotment


@dataclass(frozen=True, slots=True)
class Instrument:
    """Signal-to-noise of one stream, from one known number, and its calibration floor."""

    signal_to_noise: float
    """At `reference_mag` in `reference_s`. Continuum stream: of the flux in the band. Line
    stream: of the continuum per observed angstrom next to the line."""
    reference_band: str
    reference_mag: float
    """AB for u g r i z, Vega for B V R; light of AGN and host together."""
    reference_s: float
    reference_airmass: float
    sky_share: float
    """Share of the noise variance at the reference that does not come from the target (sky,
    read-out), in [0, 1)."""
    floor: float
    """Fractional calibration error of each epoch that no exposure beats."""
    extinction_mag: float
    """Atmospheric extinction per unit airmass."""


@dataclass(frozen=True, slots=True)
class Stream:
    """One of the two light curves and how it is taken."""

    kind: str
    """``"continuum"`` or ``"line"``."""
    telescope: str
    cadence_nights: tuple[float, ...]
    """Candidate cadences, each >= 1, ascending."""
    exposure_s: float
    overhead_s: float
    """Read-out, arcs, standards: time added to each visit besides the telescope's slew."""
    instrument: Instrument


@dataclass(frozen=True, slots=True)
class Limits:
    """When the observer is willing to observe."""

    airmass: float
    sun_altitude_deg: float
    """Upper limit of the sun's altitude: -6, -12 or -18 for the usual twilights."""
    moon_separation_deg: float
    """Lower limit of the moon's distance while the moon is above the horizon."""
