"""What a campaign offers one target: nights, visits and flux errors in both streams."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from planner.agn import LINES, magnitude_in
from planner.model.campaign import Campaign
from planner.model.observatory import Stream, TimeAllotment
from planner.model.plan import SiteSky
from planner.model.sky import Windows
from planner.model.target import Forecast, Target
from planner.model.trial import Prospect, StreamNights
from planner.sky import seasons_of
from planner.telescope import flux_error, line_flux_error, visit_s

__all__ = ["prospect_of"]

SECONDS_PER_DAY = 86400.0


def prospect_of(
    campaign: Campaign, index: int, forecast: Forecast, skies: Mapping[str, SiteSky]
) -> Prospect:
    """Return what the campaign offers its target number `index`.

    Seasons are those of the line stream's telescope: nights on which a whole visit fits into a
    window and the telescope is ours.
    """
    target = campaign.targets[index]
    line, kept = _stream_nights(campaign, campaign.line, target, index, forecast, skies)
    continuum, _ = _stream_nights(campaign, campaign.continuum, target, index, forecast, skies)
    nights = skies[campaign.site_of(campaign.line).name].nights
    return Prospect(forecast, line, continuum, tuple(seasons_of(kept, nights)))


def _stream_nights(
    campaign: Campaign,
    stream: Stream,
    target: Target,
    index: int,
    forecast: Forecast,
    skies: Mapping[str, SiteSky],
) -> tuple[StreamNights, Windows]:
    """Return the nights on offer in one stream, and the windows they stand for."""
    telescope = campaign.telescope(stream.telescope)
    site = campaign.site_of(stream).name
    sky = skies[site]
    length_s = visit_s(stream, telescope)
    rows = _usable(sky, index, length_s / SECONDS_PER_DAY, telescope.time)
    w = sky.windows
    half = 0.5 * length_s / SECONDS_PER_DAY
    best = np.clip(w.best_mjd[rows], w.start_mjd[rows] + half, w.end_mjd[rows] - half)
    nights = StreamNights(
        site=site,
        night=w.night[rows].astype(np.int64),
        window_start_mjd=w.start_mjd[rows],
        window_end_mjd=w.end_mjd[rows],
        best_mjd=best,
        airmass=w.airmass_min[rows],
        moon_separation_deg=w.moon_separation_deg[rows],
        flux_error=_errors(campaign, stream, target, forecast, w.airmass_min[rows]),
        visit_s=length_s,
    )
    return nights, _only(w, rows)


def _usable(sky: SiteSky, index: int, visit_d: float, time: TimeAllotment) -> NDArray[np.int64]:
    """Return the row of the longest window of each night that holds a visit and is ours."""
    w, dates = sky.windows, sky.nights.night
    if time.hours_per_night is not None and visit_d * 24 > time.hours_per_night + 1e-9:
        return np.empty(0, dtype=np.int64)
    ours = (w.target == index) & (w.end_mjd - w.start_mjd >= visit_d)
    for first, last in time.blocked:
        ours &= (dates[w.night] < first) | (dates[w.night] > last)
    rows = np.flatnonzero(ours)
    longest_first = rows[np.lexsort((w.start_mjd[rows] - w.end_mjd[rows], w.night[rows]))]
    _, at = np.unique(w.night[longest_first], return_index=True)
    return longest_first[at]


def _errors(
    campaign: Campaign,
    stream: Stream,
    target: Target,
    forecast: Forecast,
    airmass: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return the fractional flux error of one visit on each night."""
    instrument = stream.instrument
    magnitude = magnitude_in(target, instrument.reference_band, campaign.cosmology)
    if stream.kind == "continuum":
        return flux_error(instrument, magnitude, stream.exposure_s, airmass)
    stretch = 1 + target.redshift
    return line_flux_error(
        instrument,
        magnitude,
        stream.exposure_s,
        airmass,
        equivalent_width_obs_a=forecast.line_equivalent_width_a * stretch,
        line_width_km_s=forecast.line_width_km_s,
        wavelength_obs_a=LINES[forecast.line].wavelength_rest_a * stretch,
    )


def _only(w: Windows, rows: NDArray[np.int64]) -> Windows:
    """Return the windows of some rows."""
    return Windows(
        site=w.site,
        target=w.target[rows],
        night=w.night[rows],
        start_mjd=w.start_mjd[rows],
        end_mjd=w.end_mjd[rows],
        best_mjd=w.best_mjd[rows],
        airmass_min=w.airmass_min[rows],
        moon_separation_deg=w.moon_separation_deg[rows],
        moon_altitude_deg=w.moon_altitude_deg[rows],
        moon_illumination=w.moon_illumination[rows],
    )
