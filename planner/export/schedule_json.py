"""The schedule as plain JSON, for scripts."""

from __future__ import annotations

import json
from typing import Any

from astropy.table import Table

from planner.base.timescale import date_of_night
from planner.export.write import as_rows
from planner.model.campaign import Campaign
from planner.model.target import Target

__all__ = ["schedule_json"]

_UNITS = {
    "exposure": "exposure_s",
    "moon_separation": "moon_separation_deg",
    "parallactic_angle": "parallactic_angle_deg",
}


def schedule_json(campaign: Campaign, schedule: Table) -> bytes:
    """Return campaign, sites, telescopes, targets and visits as JSON.

    Parameters
    ----------
    campaign : Campaign
    schedule : Table
        From `planner.export.schedule_table`.

    Returns
    -------
    bytes
        UTF-8. Units are in the keys; times are ISO 8601, UTC, with a ``Z``; a night is the local
        date of its evening; coordinates are ICRS, longitudes east positive; what is not known
        is null. Targets, sites and telescopes keep the campaign file's order, visits the table's.
    """
    found = {
        "about": schedule.meta["note"],
        "campaign": {
            "name": campaign.name,
            "first_night": date_of_night(campaign.first_night),
            "last_night": date_of_night(campaign.last_night),
            "airmass_max": campaign.limits.airmass,
            "sun_altitude_max_deg": campaign.limits.sun_altitude_deg,
            "moon_separation_min_deg": campaign.limits.moon_separation_deg,
        },
        "sites": [
            {
                "name": s.name,
                "latitude_deg": s.latitude_deg,
                "longitude_deg": s.longitude_deg,
                "elevation_m": s.elevation_m,
                "time_zone": s.time_zone,
            }
            for s in campaign.sites
        ],
        "telescopes": [
            {"name": t.name, "site": t.site, "aperture_m": t.aperture_m}
            for t in campaign.telescopes
        ],
        "targets": [_target(t) for t in campaign.targets],
        "visits": [
            {_UNITS.get(key, key): value for key, value in row.items()} for row in as_rows(schedule)
        ],
    }
    return (json.dumps(found, indent=1, ensure_ascii=False, allow_nan=False) + "\n").encode(
        errors="backslashreplace"
    )


def _target(target: Target) -> dict[str, Any]:
    magnitude = target.magnitude
    return {
        "name": target.name,
        "ra_deg": target.ra_deg,
        "dec_deg": target.dec_deg,
        "redshift": target.redshift,
        "magnitude_mag": magnitude.value_mag if magnitude else None,
        "magnitude_band": magnitude.band if magnitude else None,
        "priority": target.priority,
    }
