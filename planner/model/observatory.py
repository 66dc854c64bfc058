"""Sites, telescopes and the two streams."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = [
    "Camera",
    "Feed",
    "KnownCase",
    "Limits",
    "LineMeasurement",
    "Site",
    "SkyQuality",
    "Spectrograph",
    "Stream",
    "Telescope",
    "TimeAllotment",
    "WeatherClimate",
]


@dataclass(frozen=True, slots=True)
class WeatherClimate:
    """How often a site is clear, and how long bad weather lasts."""

    clear_fraction: tuple[float, ...]
    """Share of usable nights in each month, January first; 12 values in [0, 1]."""
    bad_spell_nights: float
    """Mean length of a run of lost nights, >= 1."""


@dataclass(frozen=True, slots=True)
class SkyQuality:
    """Seeing, dark sky and extinction, the latter two by band as (name, value) pairs."""

    seeing_arcsec: float
    """Full width at half maximum at the zenith at 5000 angstrom."""
    dark_mag: tuple[tuple[str, float], ...]
    """Moonless zenith, per square arcsec: AB for u g r i z, Vega for B V R."""
    extinction_mag: tuple[tuple[str, float], ...]
    """Per unit airmass."""


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
    sky: SkyQuality


@dataclass(frozen=True, slots=True)
class TimeAllotment:
    """What the observer has been, or hopes to be, granted on one telescope."""

    hours: float | None = None
    """Clock hours over the whole campaign; None: no cap."""
    nights: int | None = None
    """Nights on which the telescope may be used; None: no cap."""
    hours_per_night: float | None = None
    """Clock hours in one night; None: the whole night."""
    least_hours_per_night: float = 0.0
    """Clock hours that are charged for any night on which the telescope is used."""
    blocked: tuple[tuple[int, int], ...] = ()
    """Runs of nights not ours, each (first, last) inclusive, as the MJD of the evening date."""


@dataclass(frozen=True, slots=True)
class Telescope:
    """One telescope at one site."""

    name: str
    site: str
    aperture_m: float
    obstruction: float
    """Diameter of the central obstruction over that of the mirror, in [0, 1)."""
    slew_s: float
    """From one target to the next, spent on each visit."""
    acquisition_s: float
    """Centring, focus, guiding: spent on each visit."""
    technical_loss: float
    """Share of the nights lost to anything but weather, in [0, 1)."""
    time: TimeAllotment


@dataclass(frozen=True, slots=True)
class KnownCase:
    """Signal-to-noise from one known number, such as an instrument's own calculator gives."""

    signal_to_noise: float
    """Imaging: of the flux in the band. Spectra: of the continuum per observed angstrom."""
    band: str
    magnitude_mag: float
    """AB for u g r i z, Vega for B V R; light of AGN and host together."""
    exposure_s: float
    airmass: float
    sky_share: float | None
    """Share of the noise variance that comes from a dark sky, in [0, 1); None: estimated."""
    read_share: float
    """Share of the noise variance that comes from read-out, in [0, 1)."""


@dataclass(frozen=True, slots=True)
class Camera:
    """Full description of an imager."""

    band: str
    throughput: float
    """Share of the photons above the telescope's mirrors that are detected, in (0, 1]."""
    pixel_arcsec: float
    read_noise_e: float
    """Electrons rms of a pixel and read-out."""
    dark_e_s: float
    """Electrons per second and pixel."""
    aperture_fwhm: float
    """Radius of the photometric aperture in units of the seeing's FWHM."""
    comparison_mag: float | None
    """Magnitude of a comparison star in the band; None: its photon noise is left out."""
    comparison_stars: int


@dataclass(frozen=True, slots=True)
class Spectrograph:
    """Full description of a slit or fibre spectrograph."""

    throughput: float
    """Share of the photons that enter the slit that are detected, mirrors included, in (0, 1]."""
    dispersion_a: float
    """Observed angstrom per pixel."""
    resolution_a: float
    """Full width at half maximum of an unresolved line, observed angstrom."""
    slit_arcsec: float
    """Width of the slit or diameter of the fibre."""
    fibre: bool
    slit_angle_deg: float | None
    """Position angle of the slit, north through east; None: along the parallactic angle."""
    guide_a: float
    """Wavelength whose image is kept on the slit, observed angstrom."""
    pixel_arcsec: float
    """Along the slit."""
    read_noise_e: float
    dark_e_s: float


@dataclass(frozen=True, slots=True)
class LineMeasurement:
    """How a broad line's flux is measured and calibrated in spectra."""

    continuum_window_a: float | None
    """Total rest width of the windows beside the line that give the continuum below it; None: as
    wide as the line's own window."""
    narrow_width_a: float | None
    """Rest equivalent width of the narrow lines that scale the spectra; None: they do not."""


@dataclass(frozen=True, slots=True)
class Feed:
    """One telescope's part in a stream."""

    telescope: str
    instrument: KnownCase | Camera | Spectrograph
    floor: float
    """Fractional calibration error of each epoch that no exposure beats. In spectra it is an
    error of the whole spectrum's scale."""
    exposure_s: float | None
    """Shutter time of one epoch; None: found for each target."""
    wanted_error: float
    """Fractional flux error to reach where the exposure is found for each target."""
    longest_s: float
    """Most shutter time for one epoch where the exposure is found for each target."""
    exposures: int
    """Frames into which an epoch's shutter time is split."""
    read_out_s: float
    """Of each frame."""
    overhead_s: float
    """Arcs, offsets and the like: time added to each visit."""
    standards_s: float
    """Standard stars: time added once a night on which the telescope is used for this stream."""
    moon_illumination_max: float
    """Largest illuminated fraction of a moon that is up; 1: any moon."""


@dataclass(frozen=True, slots=True)
class Stream:
    """One of the two light curves and how it is taken."""

    kind: str
    """``"continuum"`` or ``"line"``."""
    cadence_nights: tuple[float, ...]
    """Candidate cadences, each >= 1, ascending; empty: generated for each target."""
    feeds: tuple[Feed, ...]
    """The telescopes that are joined into this light curve, the main one first. Empty for a
    continuum that is measured in the line's spectra alone."""
    in_spectra: bool
    """Continuum: also (or only) measured in the line's spectra, sharing their scale error."""
    time: TimeAllotment
    """Caps on this stream alone, besides those of its telescopes."""
    measurement: LineMeasurement | None
    """Of the line stream; None for the continuum."""
    deepen: tuple[float, ...] = (1.0,)
    """Candidate exposures over those of the feeds."""


@dataclass(frozen=True, slots=True)
class Limits:
    """When the observer is willing to observe."""

    airmass: float
    sun_altitude_deg: float
    """Upper limit of the sun's altitude: -6, -12 or -18 for the usual twilights."""
    moon_separation_deg: float
    """Lower limit of the moon's distance while the moon is above the horizon."""
