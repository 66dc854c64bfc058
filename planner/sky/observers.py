"""The same sites and limits as astroplan's objects, for users who know those."""

from __future__ import annotations

from typing import TYPE_CHECKING

from planner.base.timescale import offline
from planner.model.observatory import Limits, Site

if TYPE_CHECKING:
    from astroplan import Constraint, Observer

__all__ = ["constraints", "observer"]


def observer(site: Site) -> Observer:
    """Return `site` as an astroplan observer with zero pressure (no refraction).

    Take a new one for each list of targets: its altitude cache mixes up targets of equal right
    ascension. Use it inside ``planner.base.timescale.offline()``, else astropy may ask the network
    for Earth-orientation tables.
    """
    with offline():
        from astroplan import Observer
        from astropy import units as u
        from astropy.coordinates import EarthLocation

        location = EarthLocation.from_geodetic(
            site.longitude_deg * u.deg, site.latitude_deg * u.deg, site.elevation_m * u.m
        )
        return Observer(location=location, name=site.name, pressure=0 * u.hPa, timezone="UTC")


def constraints(limits: Limits) -> list[Constraint]:
    """Return `limits` as astroplan constraints: airmass, night, moon.

    Unlike `planner.sky.windows_of`, astroplan keeps its distance from the moon also while the moon
    is below the horizon.
    """
    with offline():
        from astroplan import AirmassConstraint, AtNightConstraint, MoonSeparationConstraint
        from astropy import units as u

        return [
            AirmassConstraint(max=limits.airmass),
            AtNightConstraint(max_solar_altitude=limits.sun_altitude_deg * u.deg),
            MoonSeparationConstraint(min=limits.moon_separation_deg * u.deg),
        ]
