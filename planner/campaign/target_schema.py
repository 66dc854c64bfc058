"""One target as it stands in a list, and the record it becomes."""

from __future__ import annotations

import math
from typing import Annotated

from pydantic import BeforeValidator, ValidationInfo

from planner.base import quantities
from planner.base.quantities import shown
from planner.campaign.fields import (
    Declination,
    Name,
    RightAscension,
    Text,
    choice,
    number,
    quantity,
    read_text,
)
from planner.campaign.schema import BRIGHTNESS, LINES, Band, MagnitudeValue
from planner.campaign.sections import Section, needed, usual
from planner.campaign.sheet import Sheet
from planner.campaign.yaml_nodes import Place
from planner.model.target import Magnitude, Target

__all__ = ["TargetSection", "read_target"]

_LUMINOSITY = "log10 of the luminosity in erg/s from 38 to 49, such as 43.9"
_FRACTION = "a fraction from 0 up to 1, such as 0.4 or 40 %"
_MASS = "a mass from 1e4 to 1e12 Msun, such as 3e7 Msun"


def _log_luminosity(value: object, info: ValidationInfo) -> float:
    """Read log10; a luminosity itself (1e44, with or without erg/s) is meant when it is that."""
    text = value if isinstance(value, str) else ""
    number, unit = quantities.split(text, _LUMINOSITY)
    linear = number > 1000
    if unit and not unit.lower().startswith("dex"):
        number, linear = quantities.in_unit(text, "erg/s", _LUMINOSITY), True
    if linear and number > 0:
        if info.context:
            info.context["notes"].append(f"{info.context['where']}: {text} is read as erg/s")
        number = math.log10(number)
    if (linear and number <= 0) or not 38 <= number <= 49:
        raise ValueError(f"{shown(text)} is out of range; expected {_LUMINOSITY}")
    return number


def _fraction(text: str) -> float:
    percent = text.rstrip().endswith("%")
    read = quantities.in_unit(text, "", _FRACTION) if percent else None
    value = quantities.plain_number(text, _FRACTION) if read is None else read
    if not 0 <= value < 1:
        raise ValueError(f"{shown(text)} is out of range; expected {_FRACTION}")
    return value


LogLuminosity = Annotated[float, BeforeValidator(_log_luminosity)]


class MagnitudeSection(Section):
    """``magnitude``: AGN and host together, as observed."""

    band: Band = needed("u g r i z (AB) or B V R (Vega)")
    value: MagnitudeValue = needed(BRIGHTNESS)


class VariabilitySection(Section):
    """``variability``: of the AGN's own light."""

    amplitude: (
        Annotated[float, number("0.001 to 3, such as 0.12 mag", lambda v: 1e-3 <= v <= 3, "mag")]
        | None
    ) = None
    timescale: (
        Annotated[
            float,
            quantity("d", "a rest-frame time, 0.1 d to 1e5 d: 80 d", lambda v: 0.1 <= v <= 1e5),
        ]
        | None
    ) = None


class TargetSection(Section):
    """One target."""

    name: Name = needed("a name such as Corran 3")
    ra: RightAscension = needed("ICRS, such as 12:30:45.6 or 187.69 deg")
    dec: Declination = needed("ICRS, such as -05:23:28 or -5.391 deg")
    redshift: Annotated[
        float, number("a redshift above 0, up to 7, such as 0.05", lambda v: 0 < v <= 7)
    ] = needed("a redshift such as 0.05")
    magnitude: MagnitudeSection | None = None
    log_luminosity_5100: LogLuminosity | None = None
    log_luminosity_3000: LogLuminosity | None = None
    log_luminosity_1350: LogLuminosity | None = None
    line: Annotated[str, choice(LINES)] | None = None
    host_fraction: Annotated[float, read_text(_fraction, _FRACTION)] | None = None
    ebv: Annotated[
        float, number("E(B-V) from 0 to 5 mag, such as 0.03", lambda v: 0 <= v <= 5, "mag")
    ] = usual("0", "no Galactic reddening given")
    line_width: (
        Annotated[
            float,
            quantity("km/s", "100 to 50000 km/s, such as 4000 km/s", lambda v: 100 <= v <= 5e4),
        ]
        | None
    ) = None
    line_equivalent_width: (
        Annotated[
            float,
            quantity(
                "angstrom", "1 to 2000 angstrom, such as 80 angstrom", lambda v: 1 <= v <= 2e3
            ),
        ]
        | None
    ) = None
    mass: Annotated[float, quantity("Msun", _MASS, lambda v: 1e4 <= v <= 1e12)] | None = None
    variability: VariabilitySection | None = None
    lag_rest: (
        Annotated[
            float,
            quantity("d", "a rest-frame lag, 0.01 d to 1e4 d: 20 d", lambda v: 0.01 <= v <= 1e4),
        ]
        | None
    ) = None
    priority: Annotated[
        float, number("a number above 0, up to 1000, such as 2", lambda v: 0 < v <= 1000)
    ] = usual("1", "all targets alike")
    iron_strength: (
        Annotated[float, number("a flux ratio from 0 to 5, such as 0.6", lambda v: 0 <= v <= 5)]
        | None
    ) = None
    notes: Text | None = None


def read_target(sheet: Sheet, path: Place) -> tuple[TargetSection, Target] | None:
    """Return the target at `path` as section and record; None, with its problems noted, if wrong.

    Where a magnitude and a luminosity are both given, both are kept: the luminosity decides the
    lag, the magnitude the noise.
    """
    before = len(sheet.problems)
    section = sheet.read(TargetSection, path)
    if section is None or len(sheet.problems) > before:
        return None
    given = [
        (wavelength, value)
        for wavelength in (5100, 3000, 1350)
        if (value := getattr(section, f"log_luminosity_{wavelength}")) is not None
    ]
    if not given and section.magnitude is None:
        sheet.fault(
            path, "no brightness", "magnitude: {band: g, value: 16.2} or log_luminosity_5100"
        )
        return None
    if len(given) > 1:
        second = f"log_luminosity_{given[1][0]}"
        sheet.fault((*path, second), "a second luminosity", "one log_luminosity in a target")
        return None
    if given and section.magnitude:
        sheet.notes.append(
            f"{sheet.file}: {section.name}: both brightnesses are used, the luminosity for the lag "
            "and the magnitude for the noise"
        )
    return section, _record(section, given[0] if given else None)


def _record(section: TargetSection, luminosity: tuple[int, float] | None) -> Target:
    magnitude, own = section.magnitude, section.variability
    return Target(
        name=section.name,
        ra_deg=section.ra,
        dec_deg=section.dec,
        redshift=section.redshift,
        magnitude=Magnitude(magnitude.band, magnitude.value) if magnitude else None,
        log_luminosity=luminosity,
        line=section.line,
        host_fraction=section.host_fraction,
        ebv_mag=section.ebv,
        line_width_km_s=section.line_width,
        line_equivalent_width_a=section.line_equivalent_width,
        log_mass=math.log10(section.mass) if section.mass else None,
        amplitude_mag=own.amplitude if own else None,
        timescale_rest_d=own.timescale if own else None,
        lag_rest_d=section.lag_rest,
        priority=section.priority,
        iron_strength=section.iron_strength,
        notes=section.notes or "",
    )
