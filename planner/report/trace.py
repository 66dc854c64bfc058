"""How each number of one target came about."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from planner.agn import LINES, RELATIONS
from planner.model.campaign import Campaign
from planner.model.observatory import Camera, Feed, KnownCase
from planner.model.target import Forecast, Target
from planner.model.trial import FeedNights, Prospect

__all__ = ["Step", "trace"]


class Step(NamedTuple):
    """One number, and where it comes from."""

    what: str
    value: str
    how: str


def trace(campaign: Campaign, target: Target, prospect: Prospect) -> dict[str, list[Step]]:
    """Return the numbers of one target with inputs, formulas and sources, by topic."""
    forecast = prospect.forecast
    sections = {
        "Brightness": _brightness(campaign, target, forecast),
        "Lag": _lag(campaign, target, forecast),
        "Variability": _variability(target, forecast),
        "Mass": _mass(target, forecast),
    }
    for kind, feeds in (("line", prospect.line), ("continuum", prospect.continuum)):
        for number, nights in enumerate(feeds):
            title = f"One epoch of the {kind} on {nights.telescope}"
            sections[title] = _epoch(campaign, kind, number, nights)
    sections["Seasons"] = _seasons(campaign, prospect)
    return sections


def _brightness(campaign: Campaign, target: Target, forecast: Forecast) -> list[Step]:
    steps = []
    if target.magnitude is not None:
        given = f"{target.magnitude.band} = {target.magnitude.value_mag:g}"
        steps.append(Step("magnitude", given, "given; AGN and host together"))
    if target.log_luminosity is not None:
        wavelength, value = target.log_luminosity
        how = f"given at {wavelength} A; host light removed"
        steps.append(Step("log luminosity", f"{value:g}", how))
    host = (
        "given"
        if target.host_fraction is not None
        else "from the luminosity (Shen et al. 2011), at most half"
    )
    steps += [
        Step("host's share", f"{1 - forecast.agn_fraction:.2f}", host),
        Step("E(B-V)", f"{target.ebv_mag:g} mag", "Fitzpatrick (1999) law, R_V = 3.1"),
        Step(
            f"log L({forecast.luminosity_wavelength_a} A)",
            f"{forecast.log_luminosity:.2f} erg/s",
            "lambda L_lambda of the AGN; power law f_nu ~ nu^-0.44 (Vanden Berk et al. 2001); flat "
            f"cosmology, H0 {campaign.cosmology.hubble_km_s_mpc:g}, Omega_m "
            f"{campaign.cosmology.omega_matter:g}",
        ),
    ]
    return steps


def _lag(campaign: Campaign, target: Target, forecast: Forecast) -> list[Step]:
    line = forecast.line
    chosen = "given" if target.line else "the line within reach at this redshift"
    steps = [
        Step("line", f"{line} at {LINES[line].wavelength_rest_a:g} A rest", chosen),
    ]
    if forecast.relation == "given":
        how = "given"
    else:
        r = RELATIONS[line][forecast.relation]
        iron = f" {r.iron_slope:+g} R_Fe" if r.iron_slope else ""
        how = (
            f"log lag = {r.log_lag_d:g} + {r.slope:g} (log L - {r.pivot:g}){iron}; {r.source}; "
            f"{r.note}"
        )
        if forecast.outside_range:
            how += f"; outside {r.lowest:g} to {r.highest:g}, where it was calibrated"
    spread = 10**forecast.lag_scatter_dex
    lag = forecast.lag_obs_d
    return [
        *steps,
        Step("lag, rest frame", f"{forecast.lag_rest_d:.3g} d", how),
        Step("lag, observed", f"{lag:.3g} d", f"times 1 + z = {1 + target.redshift:g}"),
        Step(
            "68 % range",
            f"{lag / spread:.3g} to {lag * spread:.3g} d",
            f"log-normal, {forecast.lag_scatter_dex:.2f} dex: the relation's scatter, at least "
            "0.23 dex for an AGN it was not fitted to, and the luminosity's error"
            if forecast.relation != "given"
            else f"log-normal, {forecast.lag_scatter_dex:.2f} dex from year to year",
        ),
    ]


def _variability(target: Target, forecast: Forecast) -> list[Step]:
    scaling = "MacLeod et al. (2010), table 1"
    amplitude = "given" if target.amplitude_mag is not None else scaling
    timescale = "given, times 1 + z" if target.timescale_rest_d is not None else scaling
    return [
        Step(
            "amplitude",
            f"{forecast.amplitude_mag:.2g} mag rms, spread {forecast.amplitude_scatter_dex:g} dex",
            amplitude,
        ),
        Step(
            "timescale, observed",
            f"{forecast.timescale_obs_d:.2g} d, spread {forecast.timescale_scatter_dex:g} dex",
            timescale,
        ),
    ]


def _mass(target: Target, forecast: Forecast) -> list[Step]:
    width = "given" if target.line_width_km_s is not None else "usual for broad lines"
    mass = "given" if target.log_mass is not None else "virial: f c lag FWHM^2 / G, f = 1.12"
    return [
        Step("line width", f"{forecast.line_width_km_s:g} km/s FWHM", width),
        Step("log mass", f"{forecast.log_mass:.2f} suns", mass),
        Step(
            "error to expect",
            f"{forecast.mass_dex:.2f} dex",
            "lag at the rule's error, width at 5 %, and the scatter of f, 0.39 dex (Yu et al. "
            "2019), in quadrature",
        ),
    ]


def _epoch(campaign: Campaign, kind: str, number: int, nights: FeedNights) -> list[Step]:
    if not nights.night.size:
        return [Step("nights", "none", "no window holds a visit")]
    spectra = nights.in_spectra_of is not None
    stream = campaign.line if kind == "line" or spectra else campaign.continuum
    feed = stream.feeds[nights.in_spectra_of if spectra else number]  # type: ignore[index]

    def median(name: str) -> float:
        return float(np.median(getattr(nights, name)))

    unit = "per angstrom" if isinstance(feed.instrument, KnownCase) else "per pixel"
    of = f"of the continuum {unit}" if kind == "line" or spectra else "of the flux"
    return [
        Step("nights on offer", f"{nights.night.size}", "with a window that holds a visit"),
        Step("airmass", f"{median('airmass'):.2f}", "median of the best times"),
        Step(
            "sky",
            f"{median('sky_ab_mag'):.2f} mag/arcsec2 AB",
            "median; dark sky and moonlight (Krisciunas & Schaefer 1991)",
        ),
        Step("instrument", _instrument(feed), "as described in the campaign file"),
        Step("exposure", f"{nights.exposure_s:g} s", _exposure(feed, nights)),
        Step("signal-to-noise", f"{median('signal_to_noise'):.3g}", of),
        Step(
            "flux error",
            f"{100 * median('flux_error'):.2g} %",
            f"photons, sky, detector and a calibration floor of {100 * feed.floor:g} %",
        ),
        Step(
            "clock time",
            f"{nights.visit_s / 60:.1f} min",
            "slew, acquisition, exposure, read-out and overhead"
            if not spectra
            else "none of its own: comes with the spectra",
        ),
    ]


def _instrument(feed: Feed) -> str:
    known = feed.instrument
    if isinstance(known, KnownCase):
        return (
            f"S/N {known.signal_to_noise:g} at {known.band} = {known.magnitude_mag:g} in "
            f"{known.exposure_s:g} s"
        )
    if isinstance(known, Camera):
        return f"camera in {known.band}, throughput {100 * known.throughput:g} %"
    return (
        f"spectrograph, throughput {100 * known.throughput:g} %, {known.dispersion_a:g} A a pixel, "
        f"{'fibre' if known.fibre else 'slit'} {known.slit_arcsec:g} arcsec"
    )


def _exposure(feed: Feed, nights: FeedNights) -> str:
    if feed.exposure_s is not None:
        return "given"
    wanted = f"for an error of {100 * feed.wanted_error:g} % at median conditions"
    if nights.reached:
        return wanted
    return f"{wanted}, which even this longest exposure does not reach"


def _seasons(campaign: Campaign, prospect: Prospect) -> list[Step]:
    if not prospect.seasons:
        return [Step("seasons", "none", prospect.note)]
    return [
        Step(
            f"season {i + 1}",
            f"{s.nights} nights in {s.last - s.first + 1}",
            f"gap after it: {s.gap_after_nights} nights; limits: airmass "
            f"{campaign.limits.airmass:g}, moon {campaign.limits.moon_separation_deg:g} deg",
        )
        for i, s in enumerate(prospect.seasons)
    ]
