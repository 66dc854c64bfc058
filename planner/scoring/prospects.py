"""What a campaign offers one target: nights, visits and flux errors in both streams."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import InputError
from planner.model.campaign import Campaign
from planner.model.observatory import Feed, TimeAllotment
from planner.model.plan import SiteSky
from planner.model.sky import Windows
from planner.model.target import Forecast, Target
from planner.model.trial import FeedNights, Prospect
from planner.scoring.depth import Depth, depth_of
from planner.sky import seasons_of
from planner.telescope import Conditions, exposure_for, visit_s

__all__ = ["prospect_of"]

Floats = NDArray[np.float64]

SECONDS_PER_DAY = 86400.0
WITH_NARROW_LINES = ("Hbeta", "Halpha")
"""Broad lines with strong narrow lines in the same spectrum: [O III], [N II], [S II]."""
NO_CAP = 10**6
TIMES = 7
"""Times of a window that are tried for the smallest error."""
BETTER = 0.995
"""The time of least airmass is kept unless another has an error smaller by half a per cent."""
SHORTEST_EXPOSURE_S = 10.0


def prospect_of(
    campaign: Campaign, index: int, forecast: Forecast, skies: Mapping[str, SiteSky]
) -> Prospect:
    """Return what the campaign offers its target number `index`.

    Seasons are those of the line's main telescope: nights on which a whole visit fits into a
    window and the telescope is ours.
    """
    target = campaign.targets[index]
    _refuse_missing_narrow_lines(campaign, forecast)
    line = tuple(
        _feed_nights(campaign, "line", feed, target, index, forecast, skies)
        for feed in campaign.line.feeds
    )
    continuum = [
        _feed_nights(campaign, "continuum", feed, target, index, forecast, skies)
        for feed in campaign.continuum.feeds
    ]
    if campaign.continuum.in_spectra:
        continuum += [
            _in_spectra(campaign, number, nights, target, forecast)
            for number, nights in enumerate(line)
        ]
    sky = skies[line[0].site]
    seasons = tuple(seasons_of(_windows_of(line[0], index), sky.nights))
    note = "" if seasons else _why_none(sky, index, line[0])
    return Prospect(forecast, line, tuple(continuum), seasons, note)


def _refuse_missing_narrow_lines(campaign: Campaign, forecast: Forecast) -> None:
    measurement = campaign.line.measurement
    narrow = measurement is not None and measurement.narrow_width_a is not None
    if narrow and forecast.line not in WITH_NARROW_LINES:
        raise InputError(
            f"target {forecast.name}: no narrow lines lie beside {forecast.line} to scale its "
            "spectra with; choose the calibration `star in slit` or `absolute`"
        )


def _why_none(sky: SiteSky, index: int, line: FeedNights) -> str:
    w = sky.windows
    hours = (w.end_mjd - w.start_mjd)[w.target == index] * 24
    if not hours.size:
        return "never observable within the limits"
    visit = line.visit_s / 3600
    if hours.max() < visit:
        return f"no window holds a visit of {visit:.2g} h; the longest has {hours.max():.2g} h"
    return "no night of the telescope's time falls on a window"


def _feed_nights(
    campaign: Campaign,
    kind: str,
    feed: Feed,
    target: Target,
    index: int,
    forecast: Forecast,
    skies: Mapping[str, SiteSky],
) -> FeedNights:
    """Return the nights on offer on one telescope."""
    telescope, site = campaign.telescope(feed.telescope), campaign.site(feed.telescope)
    sky = skies[site.name]
    depth = depth_of(campaign, kind, feed, target, forecast)
    stream = campaign.line if kind == "line" else campaign.continuum
    rows_of = _Rows(sky, index, feed, (telescope.time, stream.time))
    exposure, reached = _exposure(feed, depth, rows_of)
    length_s = visit_s(feed, telescope, exposure)
    w, rows = rows_of.that_hold(length_s / SECONDS_PER_DAY)
    best, conditions = _best_times(depth, exposure, w, rows, 0.5 * length_s / SECONDS_PER_DAY)
    return FeedNights(
        telescope=feed.telescope,
        site=site.name,
        in_spectra_of=None,
        night=w.night[rows].astype(np.int64),
        window_start_mjd=w.start_mjd[rows],
        window_end_mjd=w.end_mjd[rows],
        best_mjd=best,
        airmass=np.asarray(conditions.airmass),
        sky_ab_mag=np.asarray(conditions.sky_ab_mag),
        flux_error=depth.error(exposure, conditions),
        scale_error=feed.floor if kind == "line" else 0.0,
        signal_to_noise=depth.signal_to_noise(exposure, conditions),
        exposure_s=exposure,
        visit_s=length_s,
        standards_s=feed.standards_s,
        most_visits=_most_visits((telescope.time, stream.time), length_s + feed.standards_s),
        reached=reached,
    )


def _in_spectra(
    campaign: Campaign, number: int, line: FeedNights, target: Target, forecast: Forecast
) -> FeedNights:
    """Return the continuum epochs that come with the line's spectra of one telescope."""
    feed = campaign.line.feeds[number]
    depth = depth_of(campaign, "spectra", feed, target, forecast)
    photon = depth.error(line.exposure_s, depth.conditions_at(line.best_mjd))
    return FeedNights(
        telescope=line.telescope,
        site=line.site,
        in_spectra_of=number,
        night=line.night,
        window_start_mjd=line.window_start_mjd,
        window_end_mjd=line.window_end_mjd,
        best_mjd=line.best_mjd,
        airmass=line.airmass,
        sky_ab_mag=line.sky_ab_mag,
        flux_error=np.hypot(photon, feed.floor),
        scale_error=feed.floor,
        signal_to_noise=line.signal_to_noise,
        exposure_s=0.0,
        visit_s=0.0,
        standards_s=0.0,
        most_visits=line.most_visits,
        reached=True,
    )


def _most_visits(times: tuple[TimeAllotment, ...], visit_s: float) -> int:
    """Return how many visits, one a night, the allotments pay for."""
    most = NO_CAP
    for time in times:
        if time.nights is not None:
            most = min(most, time.nights)
        if time.hours is not None:
            night = max(visit_s / 3600, time.least_hours_per_night)
            most = min(most, int(time.hours / night + 1e-9))
    return most


class _Rows:
    """The windows of one target that one telescope may use."""

    def __init__(
        self, sky: SiteSky, index: int, feed: Feed, times: tuple[TimeAllotment, ...]
    ) -> None:
        """Leave out blocked nights, and moonlight where the stream's moon limit forbids it."""
        self.times = times
        dates, lit = sky.nights.night, sky.nights.moon_illumination
        parts = []
        bright = lit > feed.moon_illumination_max
        for w, mine in ((sky.windows, ~bright), (sky.moonless, bright)):
            ours = (w.target == index) & mine[w.night]
            for first, last in (run for time in times for run in time.blocked):
                ours &= (dates[w.night] < first) | (dates[w.night] > last)
            parts.append(_only(w, np.flatnonzero(ours)))
        self.windows = _in_time_order(_joined(*parts))

    def that_hold(self, visit_d: float) -> tuple[Windows, NDArray[np.int64]]:
        """Return the windows, and of each night the row of the longest that holds a visit."""
        w = self.windows
        limits = [t.hours_per_night for t in self.times if t.hours_per_night is not None]
        if limits and visit_d * 24 > min(limits) + 1e-9:
            return w, np.empty(0, dtype=np.int64)
        rows = np.flatnonzero(w.end_mjd - w.start_mjd >= visit_d)
        longest_first = rows[np.lexsort((w.start_mjd[rows] - w.end_mjd[rows], w.night[rows]))]
        _, at = np.unique(w.night[longest_first], return_index=True)
        return w, longest_first[at]


def _exposure(feed: Feed, depth: Depth, rows: _Rows) -> tuple[float, bool]:
    """Return the exposure, found for the median conditions of the windows where that is asked."""
    if feed.exposure_s is not None:
        return feed.exposure_s, True
    w, used = rows.that_hold(0.0)
    if not used.size:
        return feed.longest_s, True
    conditions = depth.conditions_at(w.best_mjd[used])
    median = conditions._replace(
        airmass=np.median(conditions.airmass),
        sky_ab_mag=np.median(conditions.sky_ab_mag),
        parallactic_deg=np.median(conditions.parallactic_deg),
    )
    return exposure_for(
        lambda seconds: float(depth.error(seconds, median)),
        feed.wanted_error,
        SHORTEST_EXPOSURE_S,
        feed.longest_s,
    )


def _best_times(
    depth: Depth, exposure_s: float, w: Windows, rows: NDArray[np.int64], half_d: float
) -> tuple[Floats, Conditions]:
    """Return the middle of each night's best visit, and the conditions then."""
    earliest, latest = w.start_mjd[rows] + half_d, w.end_mjd[rows] - half_d
    highest = np.clip(w.best_mjd[rows], earliest, latest)
    spread = earliest[:, None] + (latest - earliest)[:, None] * np.linspace(0, 1, TIMES)
    tried = np.concatenate([highest[:, None], spread], axis=1)
    error = depth.error(exposure_s, depth.conditions_at(tried))
    error[:, 0] *= BETTER
    best = np.take_along_axis(tried, np.argmin(error, axis=1)[:, None], axis=1)[:, 0]
    return best, depth.conditions_at(best)


_COLUMNS = (
    "target", "night", "start_mjd", "end_mjd", "best_mjd", "airmass_min", "moon_separation_deg",
    "moon_altitude_deg", "moon_illumination",
)  # fmt: skip


def _only(w: Windows, rows: NDArray[np.int64]) -> Windows:
    """Return the windows of some rows."""
    return Windows(w.site, *(getattr(w, name)[rows] for name in _COLUMNS))


def _joined(a: Windows, b: Windows) -> Windows:
    columns = (np.concatenate([getattr(a, n), getattr(b, n)]) for n in _COLUMNS)
    return Windows(a.site, *columns)


def _in_time_order(w: Windows) -> Windows:
    return _only(w, np.argsort(w.start_mjd, kind="stable"))


def _windows_of(nights: FeedNights, index: int) -> Windows:
    """Return the nights on offer as windows, for the search of seasons."""
    count = nights.night.size
    nothing = np.zeros(count)
    return Windows(
        site=nights.site,
        target=np.full(count, index, dtype=np.int32),
        night=nights.night.astype(np.int32),
        start_mjd=nights.window_start_mjd,
        end_mjd=nights.window_end_mjd,
        best_mjd=nights.best_mjd,
        airmass_min=nights.airmass,
        moon_separation_deg=nothing,
        moon_altitude_deg=nothing,
        moon_illumination=nothing,
    )
