"""Night sheets: one printable page a night, for whoever stands at the telescope."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from datetime import UTC, datetime, timedelta, timezone, tzinfo
from importlib.resources import files
from typing import Any
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

import erfa
import numpy as np
from numpy.typing import NDArray

from planner.base.timescale import date_of_night, tt_of_utc
from planner.export.airmass_track import HEIGHT, SAMPLES, WIDTH, look, ticks, track
from planner.export.sexagesimal import dec_text, ra_text
from planner.export.standards import Match, standards_for
from planner.model.campaign import Campaign
from planner.model.observatory import Site
from planner.model.plan import SiteSky, Visit
from planner.model.sky import Nights
from planner.sky import airmass_of, moon_separation, positions_at, sun_moon_at

__all__ = ["night_sheets"]

Floats = NDArray[np.float64]

_MOON_SAMPLES = 97
BACKUPS = 3
"""Most targets named for poor conditions."""


def night_sheets(campaign: Campaign, skies: dict[str, SiteSky], visits: Sequence[Visit]) -> bytes:
    """Return an HTML file with one page for each night and site with visits.

    Parameters
    ----------
    campaign : Campaign
    skies : dict of str to SiteSky
        By site, over all nights of the campaign.
    visits : sequence of Visit
        The schedule, in any order.

    Notes
    -----
    Times are UTC; those on the site's clock stand beside them, by the site's time zone, else by
    the whole hour nearest to its longitude, which the page then says. Standards are those nearest
    in airmass at the middle of each spectrum. For poor conditions the brightest targets are
    named that are up and have no visit that night: magnitudes are compared as given, whatever
    their bands.
    """
    import jinja2

    environment = jinja2.Environment(
        autoescape=True, undefined=jinja2.StrictUndefined, trim_blocks=True, lstrip_blocks=True
    )
    template = environment.from_string((files("planner.export") / "nights.html").read_text("utf-8"))
    pages = [
        page for site in campaign.sites for page in _pages(campaign, site, skies[site.name], visits)
    ]
    pages.sort(key=lambda page: page["night"])
    return template.render(campaign=campaign, pages=pages, width=WIDTH, height=HEIGHT).encode(
        errors="replace"
    )


def _pages(
    campaign: Campaign, site: Site, sky: SiteSky, visits: Sequence[Visit]
) -> list[dict[str, Any]]:
    """Return one site's nights, each as what its page shows."""
    here = [v for v in visits if campaign.site(v.telescope).name == site.name]
    here.sort(key=lambda v: (v.start_mjd, v.telescope, v.target))
    if not here:
        return []
    rows: dict[int, list[dict[str, Any]]] = defaultdict(list)
    for visit, row in zip(here, _rows(campaign, site, here), strict=True):
        rows[visit.night].append(row)
    clock, words = clock_of(site)
    moons = _moon_words(site, sky.nights, sorted(rows))
    tracks = _tracks(campaign, site, sky.nights, rows)
    return [
        {
            "night": date_of_night(campaign.first_night + night),
            "site": site.name,
            "clock": words,
            "dark": _span(sky.nights.dark_start_mjd[night], sky.nights.dark_end_mjd[night], clock),
            "sidereal": [
                sidereal_text(site, float(edge[night]))
                for edge in (sky.nights.dark_start_mjd, sky.nights.dark_end_mjd)
            ],
            "lit": round(100 * float(sky.nights.moon_illumination[night])),
            "moon": moons[night],
            "visits": rows[night],
            "backups": _backups(campaign, sky, night, {r["target"] for r in rows[night]}, clock),
            **tracks[night],
        }
        for night in sorted(rows)
    ]


def _rows(campaign: Campaign, site: Site, visits: Sequence[Visit]) -> list[dict[str, Any]]:
    """Return the visits of one site as rows of the sheets' tables, in their order."""
    where = {t.name: t for t in campaign.targets}
    clock, _ = clock_of(site)
    ra = np.array([where[v.target].ra_deg for v in visits])
    dec = np.array([where[v.target].dec_deg for v in visits])
    start = np.array([v.start_mjd for v in visits])
    end = np.array([v.end_mjd for v in visits])
    middle = (start + end) / 2
    times = np.stack([start, middle, end])
    airmass = airmass_of(positions_at(ra, dec, site, times).altitude_deg)
    angle = positions_at(ra, dec, site, middle).parallactic_angle_deg
    moon = moon_separation(ra, dec, site, middle)
    standards = standards_for(ra, dec, site, middle, campaign.limits.airmass)
    return [
        {
            "target": v.target,
            "ra": ra_text(ra[i]),
            "dec": dec_text(dec[i]),
            "stream": v.stream,
            "telescope": v.telescope,
            "span": _span(start[i], end[i], clock),
            "sidereal": sidereal_text(site, float(start[i])),
            "exposure_s": v.exposure_s,
            "airmass": [_airmass_text(x) for x in airmass[:, i]],
            "moon_deg": round(float(moon[i])),
            "angle_deg": round(float(angle[i])),
            "standards": [_standard(m) for m in standards[i]] if v.stream == "line" else [],
            "mjd": times[:, i],
            "airmasses": airmass[:, i],
        }
        for i, v in enumerate(visits)
    ]


def _standard(match: Match) -> dict[str, Any]:
    star = match.standard
    return {
        "name": star.name,
        "ra": ra_text(star.ra_deg)[:-1],
        "dec": dec_text(star.dec_deg)[:-2],
        "v_mag": star.v_mag,
        "airmass": f"{match.airmass:.2f}",
        "source": star.source,
    }


def _tracks(
    campaign: Campaign, site: Site, nights: Nights, rows: dict[int, list[dict[str, Any]]]
) -> dict[int, dict[str, Any]]:
    """Return each night's drawing: tracks of its targets, thick where they are visited."""
    where = {t.name: t for t in campaign.targets}
    limit = campaign.limits.airmass
    pairs = [(n, name) for n in rows for name in dict.fromkeys(r["target"] for r in rows[n])]
    share = np.linspace(0.0, 1.0, SAMPLES)
    begin = np.array([nights.dark_start_mjd[n] for n, _ in pairs])
    length = np.array([nights.dark_end_mjd[n] for n, _ in pairs]) - begin
    ra = np.array([where[name].ra_deg for _, name in pairs])
    dec = np.array([where[name].dec_deg for _, name in pairs])
    mjd = begin[:, None] + length[:, None] * share
    airmass = airmass_of(positions_at(ra[:, None], dec[:, None], site, mjd).altitude_deg)
    curves: dict[int, list[dict[str, Any]]] = defaultdict(list)
    for i, (night, name) in enumerate(pairs):

        def drawn(row: dict[str, Any], at: int = i) -> list[str]:
            return track((row["mjd"] - begin[at]) / length[at], row["airmasses"], limit + 0.01)

        own = [r for r in rows[night] if r["target"] == name]
        curves[night].append(
            {
                "name": name,
                **look(len(curves[night])),
                "lines": track(share, airmass[i], limit),
                "spectra": [p for r in own if r["stream"] == "line" for p in drawn(r)],
                "images": [
                    p.split()[1].split(",")
                    for r in own
                    if r["stream"] == "continuum"
                    for p in drawn(r)
                ],
            }
        )
    drawings = {}
    for night, found in curves.items():
        hours, marks = ticks(
            float(nights.dark_start_mjd[night]), float(nights.dark_end_mjd[night]), limit
        )
        drawings[night] = {"curves": found, "hours": hours, "marks": marks}
    return drawings


def _backups(
    campaign: Campaign, sky: SiteSky, night: int, visited: set[str], clock: tzinfo
) -> list[dict[str, Any]]:
    """Return the brightest targets with a window and without a visit in one night."""
    windows = sky.windows
    found: list[dict[str, Any]] = []
    for index, target in enumerate(campaign.targets):
        at = np.flatnonzero((windows.night == night) & (windows.target == index))
        if target.name not in visited and target.magnitude and at.size:
            found.append(
                {
                    "target": target.name,
                    "ra": ra_text(target.ra_deg),
                    "dec": dec_text(target.dec_deg),
                    "mag": target.magnitude.value_mag,
                    "band": target.magnitude.band,
                    "airmass": f"{windows.airmass_min[at].min():.2f}",
                    "spans": [_span(windows.start_mjd[k], windows.end_mjd[k], clock) for k in at],
                }
            )
    return sorted(found, key=lambda row: float(row["mag"]))[:BACKUPS]


def _moon_words(site: Site, nights: Nights, wanted: Sequence[int]) -> dict[int, str]:
    """Say of each wanted night when the moon rises and sets while it is dark."""
    start, end = nights.dark_start_mjd[list(wanted)], nights.dark_end_mjd[list(wanted)]
    mjd = np.linspace(start, end, _MOON_SAMPLES, axis=1)
    altitude = sun_moon_at(site, mjd).moon_altitude_deg
    return {
        night: moon_words(mjd[i], altitude[i], float(start[i]), float(end[i]))
        for i, night in enumerate(wanted)
    }


def moon_words(mjd: Floats, altitude_deg: Floats, start: float, end: float) -> str:
    """Say when a moon crosses the horizon, by straight lines between samples of its altitude."""
    up = altitude_deg > 0.0
    told = []
    for k in np.flatnonzero(up[1:] != up[:-1]):
        low, high = altitude_deg[k], altitude_deg[k + 1]
        at = float(mjd[k] + (mjd[k + 1] - mjd[k]) * low / (low - high))
        verb = "sets" if up[k] else "rises"
        told.append(
            f"{verb} {_moment(at, UTC)} UTC, {24 * (at - start):.1f} h after dark begins and "
            f"{24 * (end - at):.1f} h before it ends"
        )
    return "; ".join(told) or ("up all night" if up[0] else "below the horizon all night")


def clock_of(site: Site) -> tuple[tzinfo, str]:
    """Return the clock of a site, and what it goes by in words."""
    why = "no time zone is given"
    if site.time_zone:
        try:
            return ZoneInfo(site.time_zone), site.time_zone
        except (ZoneInfoNotFoundError, ValueError, OSError):
            why = f"{site.time_zone} is not known to this machine"
    hours = round(site.longitude_deg / 15)
    return timezone(timedelta(hours=hours)), f"UTC{hours:+d} h by the longitude ({why})"


def _span(start: float, end: float, clock: tzinfo) -> dict[str, str]:
    return {
        "utc": f"{_moment(start, UTC)}–{_moment(end, UTC)}",
        "local": f"{_moment(start, clock)}–{_moment(end, clock)}",
    }


def _moment(utc_mjd: float, clock: tzinfo) -> str:
    """Return ``HH:MM`` on a clock, to the nearest minute."""
    minutes = timedelta(minutes=round(float(utc_mjd) * 1440))
    return (datetime(1858, 11, 17, tzinfo=UTC) + minutes).astimezone(clock).strftime("%H:%M")


def sidereal_text(site: Site, utc_mjd: float) -> str:
    """Return the local mean sidereal time as ``HH:MM`` (IAU 2006, UT1 = UTC)."""
    gmst = erfa.gmst06(2400000.5, utc_mjd, 2400000.5, float(tt_of_utc(utc_mjd)))
    minutes = round((np.degrees(gmst) + site.longitude_deg) * 4.0) % 1440
    return f"{minutes // 60:02d}:{minutes % 60:02d}"


def _airmass_text(airmass: float) -> str:
    return f"{airmass:.2f}" if np.isfinite(airmass) else "–"
