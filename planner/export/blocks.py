"""What the forms of an observatory's second stage ask for, one row a repeated observation."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from astropy.table import Table

from planner.base.timescale import date_of_night
from planner.export.columns import rounded, significant, table_of
from planner.export.sexagesimal import dec_text, ra_text
from planner.model.campaign import Campaign
from planner.model.observatory import Feed, Spectrograph
from planner.model.plan import Visit
from planner.schedule import Request

__all__ = ["blocks_table"]


def blocks_table(campaign: Campaign, requests: Sequence[Request], visits: Sequence[Visit]) -> Table:
    """Return one observing block for each target, stream and telescope of a schedule.

    Parameters
    ----------
    campaign : Campaign
    requests : sequence of Request
        What the schedule was made from: `planner.schedule.requests_of`.
    visits : sequence of Visit
        The schedule.

    Notes
    -----
    A visit may be taken half a cadence early or late: our choice, the widest that keeps the order
    of visits. Seasons are those in which the layout asks for visits. Hours are the clock time of
    the scheduled visits, without standard stars.
    """
    streams = {s.kind: s for s in (campaign.line, campaign.continuum)}
    where = {t.name: t for t in campaign.targets}
    r = requests
    feeds = [streams[x.stream].feeds[x.feed] for x in r]
    targets = [where[x.target] for x in r]
    mine = [
        [
            v
            for v in visits
            if (v.target, v.stream, v.telescope) == (x.target, x.stream, x.telescope)
        ]
        for x in r
    ]
    limits = campaign.limits
    cadence = np.array([x.cadence_nights for x in r])

    def words(values: Sequence[str]) -> np.ndarray:
        return np.array(values, dtype=str)

    def median(name: str) -> list[float]:
        return [
            float(np.median(getattr(x.nights, name))) if x.nights.night.size else float("nan")
            for x in r
        ]

    return table_of(
        [
            ("target", words([x.target for x in r]), None, "name"),
            ("stream", words([x.stream for x in r]), None, "line or continuum"),
            ("telescope", words([x.telescope for x in r]), None, "where it is taken"),
            ("ra", words([ra_text(t.ra_deg) for t in targets]), None, "ICRS, hours"),
            ("dec", words([dec_text(t.dec_deg) for t in targets]), None, "ICRS, degrees"),
            ("ra_degrees", [t.ra_deg for t in targets], "deg", "ICRS"),
            ("dec_degrees", [t.dec_deg for t in targets], "deg", "ICRS"),
            ("exposure", [x.nights.exposure_s for x in r], "s", "shutter time of a visit"),
            ("frames", [f.exposures for f in feeds], None, "into which the exposure is split"),
            (
                "frame_exposure",
                rounded(
                    [x.nights.exposure_s / f.exposures for x, f in zip(r, feeds, strict=True)], 2
                ),
                "s",
                "shutter time of a frame",
            ),
            ("visit", rounded([x.nights.visit_s for x in r], 1), "s", "clock time of a visit"),
            ("cadence", cadence, "d", "wanted between visits"),
            (
                "tolerance",
                cadence / 2,
                "d",
                "either side of the wanted time: half a cadence, our choice",
            ),
            ("seasons", words([_seasons(campaign, x) for x in r]), None, "first to last evening"),
            ("airmass_max", np.full(len(r), limits.airmass), None, "limit"),
            ("sun_altitude_max", np.full(len(r), limits.sun_altitude_deg), "deg", "limit"),
            (
                "moon_separation_min",
                np.full(len(r), limits.moon_separation_deg),
                "deg",
                "limit while the moon is up",
            ),
            (
                "moon_illumination_max",
                [f.moon_illumination_max for f in feeds],
                None,
                "illuminated fraction of a moon that is up; 1: any moon",
            ),
            (
                "seeing",
                [campaign.site(x.telescope).sky.seeing_arcsec for x in r],
                "arcsec",
                "reckoned with: full width at half maximum, zenith, 5000 Angstrom; not a limit",
            ),
            (
                "position_angle",
                words([_angle(x, f) for x, f in zip(r, feeds, strict=True)]),
                None,
                "of the slit, north through east",
            ),
            ("visits", [len(m) for m in mine], None, "in the schedule for clear skies"),
            (
                "hours",
                rounded([sum(v.end_mjd - v.start_mjd for v in m) * 24 for m in mine], 3),
                "h",
                "clock time of these visits, without standard stars",
            ),
            (
                "signal_to_noise",
                significant(median("signal_to_noise")),
                None,
                "of a visit, median; images: of the flux; spectra: of the continuum per pixel (per "
                "angstrom where a known case was given)",
            ),
            (
                "flux_error",
                significant(median("flux_error")),
                None,
                "of a visit, median; fractional, calibration included; of the band or the line",
            ),
        ],
        note="A plan is no permission: the observatory's own limits, sun avoidance, safety rules "
        "and staff decide.",
    )


def _seasons(campaign: Campaign, request: Request) -> str:
    def date(night: int) -> str:
        return date_of_night(campaign.first_night + int(night))

    runs = zip(request.first, request.last, strict=True)
    return "; ".join(f"{date(first)} to {date(last)}" for first, last in runs)


def _angle(request: Request, feed: Feed) -> str:
    if request.stream == "continuum":
        return "any"
    if not isinstance(feed.instrument, Spectrograph):
        return "not given"
    if feed.instrument.fibre:
        return "any"
    angle_deg = feed.instrument.slit_angle_deg
    return "parallactic" if angle_deg is None else f"{angle_deg:g} deg"
