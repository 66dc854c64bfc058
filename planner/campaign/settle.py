"""What the observer left open and depends on the rest: which telescope, which candidates."""

from __future__ import annotations

from dataclasses import dataclass, field

from planner.campaign.parts import Parts
from planner.campaign.schema import TelescopeSection
from planner.campaign.sections import COMMON, Default
from planner.campaign.stream_schema import ContinuumSection, StreamSection

__all__ = ["KINDS", "Choices", "settle", "stream_of"]

KINDS = ("continuum", "line")
"""The two streams."""


@dataclass
class Choices:
    """The settled choices, and a note of each that was not the observer's."""

    site_of: dict[str, str] = field(default_factory=dict)
    """Telescope's name to site's name."""
    telescope_of: dict[str, TelescopeSection] = field(default_factory=dict)
    """Key of a stream, or of one of its ``also``, to telescope."""
    cadences: dict[str, tuple[float, ...]] = field(default_factory=dict)
    """Candidates; empty here and below: generated for each target."""
    season_lengths: tuple[float, ...] = ()
    seasons: tuple[int, ...] = ()
    defaults: list[Default] = field(default_factory=list)

    one_site: bool = True

    def key_of_site(self, name: str) -> str:
        """Return the key under which a site stands in the file."""
        return "site" if self.one_site else f"sites.{name}"

    def take(self, key: str, value: str, reason: str = COMMON) -> None:
        """Note a default."""
        self.defaults.append(Default(key, value, reason))


def stream_of(parts: Parts, kind: str) -> StreamSection | None:
    """Return a stream's section by its kind."""
    section: StreamSection | None = getattr(parts.streams, kind) if parts.streams else None
    return section


def settle(parts: Parts) -> Choices:
    """Fill in what is open, as far as the sections that could be read allow."""
    choices = Choices()
    _settle_sites(parts, choices)
    _settle_telescopes(parts, choices)
    _settle_candidates(parts, choices)
    if (
        parts.time
        and not parts.time.model_fields_set
        and any(not t.time for t in parts.known_telescopes())
    ):
        choices.take("time", "every night, all night", "no allotment given")
    return choices


def _settle_sites(parts: Parts, choices: Choices) -> None:
    sites = parts.known_sites()
    choices.one_site = ("site",) in parts.sites
    for telescope in parts.known_telescopes():
        if telescope.site is not None:
            choices.site_of[telescope.name] = telescope.site
        elif len(sites) == 1:
            choices.site_of[telescope.name] = sites[0].name
            choices.take(f"telescopes.{telescope.name}.site", sites[0].name, "the only site")


def _settle_telescopes(parts: Parts, choices: Choices) -> None:
    """Give the line the largest mirror and the continuum the smallest other one."""
    by_size = sorted(parts.known_telescopes(), key=lambda t: t.aperture)
    by_name = {t.name: t for t in by_size}
    asked = {kind: section.telescope for kind in KINDS if (section := stream_of(parts, kind))}
    chosen = {kind: by_name[name] for kind, name in asked.items() if name in by_name}
    for kind, size in (("line", -1), ("continuum", 0)):
        if kind == "continuum" and _only_spectra(parts):
            chosen.pop(kind, None)
        elif asked.get(kind) is None and by_size and parts.streams:
            others = [t for t in by_size if t not in chosen.values()] or by_size
            chosen[kind] = others[size]
            reason = "the larger mirror takes the line" if len(by_size) > 1 else "the only one"
            choices.take(f"streams.{kind}.telescope", others[size].name, reason)
    choices.telescope_of = {f"streams.{kind}": telescope for kind, telescope in chosen.items()}
    for kind in KINDS:
        for i, other in enumerate(getattr(stream_of(parts, kind), "also", ())):
            if other.telescope in by_name:
                choices.telescope_of[f"streams.{kind}.also[{i + 1}]"] = by_name[other.telescope]


def _only_spectra(parts: Parts) -> bool:
    """Say whether the continuum is measured in the line's spectra and nowhere else."""
    section = stream_of(parts, "continuum")
    return isinstance(section, ContinuumSection) and section.source == "spectra"


def _settle_candidates(parts: Parts, choices: Choices) -> None:
    """Take the candidates; those that are empty are generated for each target."""
    given = parts.candidates
    choices.season_lengths = given.season_lengths if given else ()
    choices.seasons = given.seasons if given else ()
    for kind in ("line", "continuum"):
        section = stream_of(parts, kind)
        if section is None:
            continue
        only_spectra = kind == "continuum" and _only_spectra(parts)
        choices.cadences[kind] = choices.cadences["line"] if only_spectra else section.cadence
