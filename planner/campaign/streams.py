"""From the streams' sections to their records, with what the observer left open filled in.

Usual depths are common practice, no source. They are only starting points that make the smallest
file work; an observer's own numbers should replace them.
"""

from __future__ import annotations

from planner.base.quantities import in_unit
from planner.campaign.parts import Parts
from planner.campaign.sections import COMMON
from planner.campaign.settle import Choices, stream_of
from planner.campaign.stream_schema import (
    AUTO,
    CALIBRATIONS,
    IMAGING_FLOOR,
    WANTED,
    CameraSection,
    ContinuumSection,
    FeedSection,
    ImagingFeedSection,
    LineSection,
    ReferenceSection,
    SpectraFeedSection,
    SpectrographSection,
)
from planner.model.observatory import (
    Camera,
    Feed,
    KnownCase,
    LineMeasurement,
    Spectrograph,
    Stream,
    TimeAllotment,
)

__all__ = ["stream_record", "usual_floor"]

_LONGEST = "1 h"


def stream_record(parts: Parts, choices: Choices, kind: str, time: TimeAllotment) -> Stream:
    """Return one stream; defaults that are settled here are added to `choices`."""
    section = stream_of(parts, kind)
    assert section is not None, "built from sections with problems"
    in_spectra = isinstance(section, ContinuumSection) and section.source in {"spectra", "both"}
    only_spectra = isinstance(section, ContinuumSection) and section.source == "spectra"
    floor = usual_floor(section)
    feeds = []
    if not only_spectra:
        feeds.append(_feed(section, f"streams.{kind}", choices, kind, floor))
        for i, other in enumerate(section.also):  # type: ignore[attr-defined]
            feeds.append(_feed(other, f"streams.{kind}.also[{i + 1}]", choices, kind, floor))
    return Stream(
        kind=kind,
        cadence_nights=choices.cadences[kind],
        feeds=tuple(feeds),
        in_spectra=in_spectra,
        time=time,
        measurement=_measurement(section) if isinstance(section, LineSection) else None,
        deepen=section.deepen if feeds else (1.0,),
    )


def usual_floor(section: FeedSection) -> tuple[str, str]:
    """Return the calibration error to take where none is given, and the reason."""
    if isinstance(section, LineSection):
        return CALIBRATIONS[section.calibration], f"{section.calibration}; {COMMON}"
    return IMAGING_FLOOR, COMMON


def _measurement(section: LineSection) -> LineMeasurement:
    narrow = section.calibration == "narrow lines"
    return LineMeasurement(section.continuum_window, section.narrow_width if narrow else None)


def _feed(
    section: FeedSection, key: str, choices: Choices, kind: str, floor: tuple[str, str]
) -> Feed:
    """Return the record of one telescope's part."""
    telescope = choices.telescope_of[key]

    def settled(name: str, usual: str, unit: str, reason: str) -> float:
        given = getattr(section, name)
        if given is not None:
            return float(given)
        choices.take(f"{key}.{name}", usual, reason)
        return in_unit(usual, unit, "")

    auto = section.exposure == AUTO
    wanted, longest = 0.0, 0.0
    if auto:
        wanted = settled("wanted_error", WANTED[kind], "", COMMON)
        longest = settled("longest_exposure", _LONGEST, "s", COMMON)
    return Feed(
        telescope=telescope.name,
        instrument=_instrument(section, key, choices, kind, telescope.aperture),
        floor=settled("floor", floor[0], "", floor[1]),
        exposure_s=None if auto else float(section.exposure),
        wanted_error=wanted,
        longest_s=longest,
        exposures=section.exposures,
        read_out_s=section.read_out,
        overhead_s=section.overhead,
        standards_s=section.standards,
        moon_illumination_max=section.moon,
    )


def _instrument(
    section: FeedSection, key: str, choices: Choices, kind: str, aperture_m: float
) -> KnownCase | Camera | Spectrograph:
    if isinstance(section, ImagingFeedSection) and section.camera is not None:
        return _camera(section.camera)
    if isinstance(section, SpectraFeedSection) and section.spectrograph is not None:
        return _spectrograph(section.spectrograph)
    known = section.signal_to_noise or _usual_case(key, choices, kind, aperture_m)
    if known.sky_share is None:
        choices.take(
            f"{key}.signal_to_noise.sky_share", "estimated", "from the dark sky and the seeing"
        )
    return KnownCase(
        signal_to_noise=known.value,
        band=known.band,
        magnitude_mag=known.magnitude,
        exposure_s=known.exposure,
        airmass=known.airmass,
        sky_share=known.sky_share,
        read_share=known.read_share,
    )


def _usual_case(key: str, choices: Choices, kind: str, aperture_m: float) -> ReferenceSection:
    """Return a usual known case for a mirror.

    Signal-to-noise grows as the mirror's diameter while photons set it. Starting points: 100 in
    the band at V = 16 in 5 min on 0.5 m, and 30 per angstrom at V = 16 in 20 min on 2 m (common
    practice, no source).
    """
    known, mirror_m, exposure, per = {
        "continuum": (100.0, 0.5, "5 min", ""),
        "line": (30.0, 2.0, "20 min", " per angstrom"),
    }[kind]
    value = f"{known * aperture_m / mirror_m:.3g}"
    choices.take(
        f"{key}.signal_to_noise",
        f"{value}{per} at V = 16 in {exposure}, airmass 1.2",
        f"scaled with the aperture; {COMMON}",
    )
    return ReferenceSection.model_validate(
        {"value": value, "band": "V", "magnitude": "16", "exposure": exposure}
    )


def _camera(section: CameraSection) -> Camera:
    return Camera(
        band=section.band,
        throughput=section.throughput,
        pixel_arcsec=section.pixel,
        read_noise_e=section.read_noise,
        dark_e_s=section.dark,
        aperture_fwhm=section.aperture,
        comparison_mag=section.comparison,
        comparison_stars=section.comparison_stars,
    )


def _spectrograph(section: SpectrographSection) -> Spectrograph:
    width = section.slit if section.slit is not None else section.fibre
    assert width is not None, "checked before"
    return Spectrograph(
        throughput=section.throughput,
        dispersion_a=section.dispersion,
        resolution_a=section.resolution,
        slit_arcsec=width,
        fibre=section.slit is None,
        slit_angle_deg=None if isinstance(section.angle, str) else section.angle,
        guide_a=section.guide,
        pixel_arcsec=section.pixel,
        read_noise_e=section.read_noise,
        dark_e_s=section.dark,
    )
