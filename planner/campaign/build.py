"""From sections that are known to be sound to the frozen campaign record."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TypeVar

from planner.campaign.cuts import success_rule
from planner.campaign.parts import Parts
from planner.campaign.schema import (
    LINES,
    LimitsSection,
    SimulationSection,
    SiteSection,
    TimeSection,
)
from planner.campaign.settle import KINDS, Choices, stream_of
from planner.campaign.streams import stream_record
from planner.model.campaign import Campaign, Cosmology, Simulation
from planner.model.observatory import (
    Limits,
    Site,
    SkyQuality,
    Telescope,
    TimeAllotment,
    WeatherClimate,
)
from planner.model.target import Target

__all__ = ["build"]

_SUN_ALTITUDE_DEG = {"civil": -6.0, "nautical": -12.0, "astronomical": -18.0}

Part = TypeVar("Part")


def build(
    parts: Parts,
    choices: Choices,
    targets: Sequence[Target],
    relations: Mapping[str, Sequence[str]] | None,
    file_name: str,
) -> Campaign:
    """Return the campaign; defaults that are settled here are added to `choices`.

    Parameters
    ----------
    parts, choices
        Read and checked without any problem.
    targets : sequence of Target
    relations : mapping or None
        Names of the known relations of each line, the usual one first.
    file_name : str
        Name of the campaign where it has none.
    """
    programme = _sound(parts.programme)
    cosmology = _sound(parts.cosmology)
    if programme.name is None:
        choices.take("campaign.name", file_name, "the file's name")
    streams = {
        kind: stream_record(parts, choices, kind, _allotment(_time_of(parts, kind)))
        for kind in KINDS
    }
    return Campaign(
        name=programme.name or file_name,
        first_night=programme.first_night,
        last_night=programme.last_night,
        seed=programme.seed,
        targets=tuple(targets),
        sites=_sites(parts, choices),
        telescopes=_telescopes(parts, choices),
        continuum=streams["continuum"],
        line=streams["line"],
        limits=_limits(_sound(parts.limits)),
        season_lengths_d=choices.season_lengths,
        seasons=choices.seasons,
        season_shifts_d=_sound(parts.candidates).season_shifts,
        success=success_rule(_sound(parts.success), choices),
        simulation=_simulation(_sound(parts.simulation)),
        cosmology=Cosmology(cosmology.hubble, cosmology.omega_matter),
        relations=_relations(parts, choices, relations),
    )


def _sound(part: Part | None) -> Part:
    assert part is not None, "built from sections with problems"
    return part


def _sites(parts: Parts, choices: Choices) -> tuple[Site, ...]:
    return tuple(
        Site(
            name=site.name,
            latitude_deg=site.latitude,
            longitude_deg=site.longitude,
            elevation_m=site.elevation,
            time_zone=site.time_zone,
            weather=WeatherClimate(site.weather.clear.fractions(), site.weather.bad_spell),
            sky=_sky(site, choices),
        )
        for site in parts.known_sites()
    )


_DARK_MAG = (
    ("u", 22.8), ("B", 22.7), ("g", 22.2), ("V", 21.8), ("r", 21.2), ("R", 20.9), ("i", 20.5),
    ("z", 19.6),
)  # fmt: skip
"""A good site far from towns, away from solar maximum: near Benn & Ellison (1998) for B V R and
the medians of a large southern survey for u to z; from memory."""
_EXTINCTION_MAG = (
    ("u", 0.50), ("B", 0.25), ("g", 0.20), ("V", 0.14), ("r", 0.10), ("R", 0.10), ("i", 0.06),
    ("z", 0.05),
)  # fmt: skip
"""A site at about 2000 m; from memory."""


def _sky(site: SiteSection, choices: Choices) -> SkyQuality:
    known = {}
    for name, usual, words in (
        ("dark_sky", _DARK_MAG, "a good dark site"),
        ("extinction", _EXTINCTION_MAG, "a site at about 2000 m"),
    ):
        given = getattr(site, name)
        known[name] = given.pairs() if given is not None and given.pairs() else usual
        if known[name] is usual:
            listed = ", ".join(f"{band}: {value:g}" for band, value in usual)
            choices.take(f"{choices.key_of_site(site.name)}.{name}", f"{{{listed}}}", words)
    return SkyQuality(site.seeing, known["dark_sky"], known["extinction"])


def _telescopes(parts: Parts, choices: Choices) -> tuple[Telescope, ...]:
    return tuple(
        Telescope(
            name=telescope.name,
            site=choices.site_of[telescope.name],
            aperture_m=telescope.aperture,
            obstruction=telescope.obstruction,
            slew_s=telescope.slew,
            acquisition_s=telescope.acquisition,
            technical_loss=telescope.technical_loss,
            time=_allotment(telescope.time or _sound(parts.time)),
        )
        for telescope in parts.known_telescopes()
    )


def _allotment(time: TimeSection) -> TimeAllotment:
    blocked = tuple(blocked.run() for blocked in time.blocked)
    return TimeAllotment(
        time.hours, time.nights, time.hours_per_night, time.least_hours_per_night or 0.0, blocked
    )


def _time_of(parts: Parts, kind: str) -> TimeSection:
    """Return the caps on a stream alone; none where none are given."""
    section = stream_of(parts, kind)
    return section.time if section and section.time else TimeSection()


def _limits(section: LimitsSection) -> Limits:
    return Limits(section.airmass, _SUN_ALTITUDE_DEG[section.twilight], section.moon_separation)


def _simulation(section: SimulationSection) -> Simulation:
    least, most = section.response_width
    return Simulation(
        trials=section.trials,
        resamples=section.resamples,
        responsivity=section.responsivity,
        response_width=(least, most),
        method=section.method,
        detrend=section.detrend == "yes",
    )


def _relations(
    parts: Parts, choices: Choices, allowed: Mapping[str, Sequence[str]] | None
) -> tuple[tuple[str, str], ...]:
    """Return the relation named for every line; ``""`` where the target may decide."""
    pairs = []
    for line in LINES:
        usual = next(iter((allowed or {}).get(line, ())), "")
        if line not in parts.relations and usual:
            choices.take(
                f"relations.{line}", usual, "the first of the planner's relations for this line"
            )
        pairs.append((line, parts.relations.get(line, "")))
    return tuple(pairs)
