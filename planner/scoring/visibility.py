"""When each target of a campaign can be observed from each site."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from planner.model.campaign import Campaign
from planner.model.plan import SiteSky
from planner.sky import nights_at, windows_of

__all__ = ["observe_sky"]


def observe_sky(campaign: Campaign) -> dict[str, SiteSky]:
    """Return, by site, the nights and the windows of all targets in them."""
    ra = np.array([t.ra_deg for t in campaign.targets])
    dec = np.array([t.dec_deg for t in campaign.targets])
    limits = campaign.limits
    no_moon = replace(limits, moon_separation_deg=180.0)
    limited = {
        campaign.site(feed.telescope).name
        for stream in (campaign.line, campaign.continuum)
        for feed in stream.feeds
        if feed.moon_illumination_max < 1.0
    }
    skies = {}
    for site in campaign.sites:
        nights = nights_at(site, campaign.first_night, campaign.last_night, limits)
        dark = (ra, dec) if site.name in limited else (ra[:0], dec[:0])
        skies[site.name] = SiteSky(
            nights,
            windows_of(ra, dec, site, nights, limits),
            windows_of(*dark, site, nights, no_moon),
        )
    return skies
