"""The streams of the campaign file: telescopes, instruments, exposures and calibration."""

from __future__ import annotations

from typing import Annotated

from pydantic import Field

from planner.base import quantities
from planner.campaign.fields import (
    AUTO,
    Name,
    auto_or_listed,
    choice,
    counted,
    listed,
    number,
    quantity,
    read_text,
    sorted_once,
)
from planner.campaign.schema import (
    BRIGHTNESS,
    GENERATED,
    Airmass,
    Band,
    MagnitudeValue,
    Pause,
    TimeSection,
)
from planner.campaign.sections import Section, needed, usual

__all__ = [
    "AUTO", "CALIBRATIONS", "IMAGING_FLOOR", "WANTED", "CameraSection", "ContinuumSection",
    "FeedSection", "LineSection", "ReferenceSection", "SpectrographSection", "StreamSection",
    "StreamsSection",
]  # fmt: skip

_TIME = "a time from 1 s to 12 h, such as 20 min"
_EXPOSURE = f"{_TIME}, or auto"
_CADENCE = "a cadence from 1 to 400 nights, such as 3 nights"
_SHARE = "a percentage from 0 to 99, such as 20 %"
_THROUGHPUT = "a percentage above 0, up to 100, such as 30 %"
_FRAMES = "a whole number of frames, such as 3"

CALIBRATIONS = {"narrow lines": "2 %", "star in slit": "2 %", "absolute": "5 %"}
"""Ways to put spectra on one scale, and the error that usually remains (common practice, no
source; narrow-line scaling between 1 and 5 %)."""

IMAGING_FLOOR = "1.5 %"
WANTED = {"continuum": "3 %", "line": "5 %"}
"""Calibration error of images, and flux errors to reach, where none are given (common practice, no
source)."""


Exposure = Annotated[float, quantity("s", _TIME, lambda v: 1 <= v <= 43200)]
Cadence = Annotated[float, quantity("d", _CADENCE, lambda v: 1 <= v <= 400)]
Cadences = Annotated[tuple[Cadence, ...], auto_or_listed(_CADENCE), sorted_once]
_FACTOR = "how many times `exposure`, from 0.05 to 50, such as [1, 2]"
Factor = Annotated[float, number(_FACTOR, lambda v: 0.05 <= v <= 50)]
Share = Annotated[float, quantity("", _SHARE, lambda v: 0 <= v <= 0.99)]
Throughput = Annotated[float, quantity("", _THROUGHPUT, lambda v: 0 < v <= 1)]
Wanted = Annotated[
    float, quantity("", "a percentage from 0.1 to 50, such as 3 %", lambda v: 0.001 <= v <= 0.5)
]
Pixel = Annotated[
    float, quantity("arcsec", "an angle from 0.01 to 20 arcsec", lambda v: 0.01 <= v <= 20)
]
ReadNoise = Annotated[
    float, number("electrons from 0 to 200, such as 5", lambda v: 0 <= v <= 200, "electron")
]
Dark = Annotated[
    float, number("electrons per second and pixel: 0.002", lambda v: 0 <= v <= 100, "electron/s")
]
Frames = Annotated[int, counted(_FRAMES, 1, 1000)]
_A = "a width in angstrom"


def _auto_or_time(text: str) -> float | str:
    if text.strip().lower() == AUTO:
        return AUTO
    return _within(quantities.in_unit(text, "s", _EXPOSURE), text, (1, 43200), _EXPOSURE)


def _within(value: float, text: str, ends: tuple[float, float], expected: str) -> float:
    if not ends[0] <= value <= ends[1]:
        raise ValueError(f"{text} is out of range; expected {expected}")
    return value


_MOONS = {"any": 1.0, "bright": 1.0, "grey": 0.65, "dark": 0.25}
_MOON = "any (or bright), grey, dark, or the most illuminated moon allowed up, such as 40 %"


def _moon(text: str) -> float:
    """Read a moon limit; what is dark or grey differs between observatories."""
    word = text.strip().lower()
    if word in _MOONS:
        return _MOONS[word]
    return _within(quantities.in_unit(text, "", _MOON), text, (0, 1), _MOON)


class ReferenceSection(Section):
    """``signal_to_noise``: one known case from which all others are scaled."""

    value: Annotated[
        float, number("a signal-to-noise above 0, such as 100", lambda v: 0 < v <= 1e5)
    ] = needed("the signal-to-noise reached, such as 100")
    band: Band = needed("one of u, g, r, i, z, B, V, R")
    magnitude: MagnitudeValue = needed(BRIGHTNESS)
    exposure: Exposure = needed(_TIME)
    airmass: Airmass = usual("1.2")
    sky_share: Share | None = None
    read_share: Share = usual("0 %", "read-out taken to be small in the known case")


class CameraSection(Section):
    """``camera``: full description of an imager."""

    band: Band = needed("one of u, g, r, i, z, B, V, R")
    throughput: Throughput = needed("detected share of the photons, such as 35 %")
    pixel: Pixel = needed("the pixel's size on the sky, such as 0.5 arcsec")
    read_noise: ReadNoise = usual("5")
    dark: Dark = usual("0.002")
    aperture: Annotated[
        float, number("a radius in seeing widths from 0.2 to 5: 1", lambda v: 0.2 <= v <= 5)
    ] = usual("1")
    comparison: MagnitudeValue | None = None
    comparison_stars: Annotated[int, counted("a whole number of stars: 5", 1, 1000)] = usual("5")


_ANGLE = "parallactic, or a position angle such as 45 deg"


def _angle(text: str) -> float | str:
    if text.strip().lower() == "parallactic":
        return "parallactic"
    return _within(quantities.in_unit(text, "deg", _ANGLE), text, (-360, 360), _ANGLE)


class SpectrographSection(Section):
    """``spectrograph``: full description of a slit or fibre spectrograph."""

    throughput: Throughput = needed("detected share of the photons in the slit, such as 20 %")
    dispersion: Annotated[
        float, quantity("Angstrom", f"{_A} from 0.01 to 100 of a pixel", lambda v: 0.01 <= v <= 100)
    ] = needed("the width of a pixel, such as 1.2 Angstrom")
    resolution: Annotated[
        float, quantity("Angstrom", f"{_A} from 0.01 to 300", lambda v: 0.01 <= v <= 300)
    ] = needed("full width of an unresolved line, such as 5 Angstrom")
    slit: Pixel | None = None
    fibre: Pixel | None = None
    angle: Annotated[float | str, read_text(_angle, _ANGLE)] = usual("parallactic")
    guide: Annotated[
        float, quantity("Angstrom", f"{_A} from 3000 to 11000", lambda v: 3000 <= v <= 11000)
    ] = usual("5500 Angstrom")
    pixel: Pixel = usual("0.4 arcsec")
    read_noise: ReadNoise = usual("5")
    dark: Dark = usual("0.002")


class FeedSection(Section):
    """What may be said of each telescope of a stream."""

    telescope: Name | None = None
    exposure: Annotated[float | str, read_text(_auto_or_time, _EXPOSURE)]
    wanted_error: Wanted | None = None
    longest_exposure: Exposure | None = None
    exposures: Frames = usual("1")
    read_out: Pause = usual("30 s")
    overhead: Pause = usual("0 s")
    standards: Pause = usual("0 s")
    moon: Annotated[float, read_text(_moon, _MOON)] = usual("any")
    floor: Share | None = None
    signal_to_noise: ReferenceSection | None = None


class StreamSection(FeedSection):
    """What both streams may say."""

    cadence: Cadences = usual(AUTO, GENERATED)
    deepen: Annotated[tuple[Factor, ...], listed(_FACTOR), sorted_once] = usual(["1"])
    time: TimeSection | None = None


class ImagingFeedSection(FeedSection):
    """One of ``also`` in the continuum."""

    exposure: Annotated[float | str, read_text(_auto_or_time, _EXPOSURE)] = usual("5 min")
    camera: CameraSection | None = None


class SpectraFeedSection(FeedSection):
    """One of ``also`` in the line."""

    exposure: Annotated[float | str, read_text(_auto_or_time, _EXPOSURE)] = usual("20 min")
    overhead: Pause = usual("5 min")
    spectrograph: SpectrographSection | None = None


class ContinuumSection(ImagingFeedSection, StreamSection):
    """``streams.continuum``."""

    source: Annotated[str, choice(("imaging", "spectra", "both"))] = usual("imaging")
    also: Annotated[tuple[ImagingFeedSection, ...], listed("a list of {telescope: ..., ...}")] = ()


class LineSection(SpectraFeedSection, StreamSection):
    """``streams.line``."""

    calibration: Annotated[str, choice(tuple(CALIBRATIONS))] = usual("star in slit")
    narrow_width: Annotated[
        float, quantity("Angstrom", f"{_A} from 1 to 500", lambda v: 1 <= v <= 500)
    ] = usual("20 Angstrom")
    continuum_window: (
        Annotated[float, quantity("Angstrom", f"{_A} from 5 to 1000", lambda v: 5 <= v <= 1000)]
        | None
    ) = None
    also: Annotated[tuple[SpectraFeedSection, ...], listed("a list of {telescope: ..., ...}")] = ()


class StreamsSection(Section):
    """``streams``."""

    continuum: ContinuumSection = Field(default={}, validate_default=True)
    line: LineSection = Field(default={}, validate_default=True)
