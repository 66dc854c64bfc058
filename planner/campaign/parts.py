"""The campaign file's sections, each read and checked on its own.

A section that is wrong is None here, so that the others are still checked and all problems come
at once.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from planner.campaign.schema import (
    LINES,
    TOP_KEYS,
    Candidates,
    CosmologySection,
    LimitsSection,
    ProgrammeSection,
    SimulationSection,
    SiteSection,
    SuccessSection,
    TelescopeSection,
    TimeSection,
)
from planner.campaign.sections import Default, Section, defaults_taken
from planner.campaign.sheet import Sheet
from planner.campaign.stream_schema import StreamsSection
from planner.campaign.yaml_nodes import Node, Place, node_at

__all__ = ["Parts", "read_parts"]


@dataclass(frozen=True)
class Parts:
    """The sections as read; None where one is wrong."""

    programme: ProgrammeSection | None
    sites: dict[Place, SiteSection | None]
    telescopes: dict[Place, TelescopeSection | None]
    streams: StreamsSection | None
    limits: LimitsSection | None
    candidates: Candidates | None
    time: TimeSection | None
    success: SuccessSection | None
    simulation: SimulationSection | None
    cosmology: CosmologySection | None
    relations: dict[str, str]

    def known_sites(self) -> list[SiteSection]:
        """Return the sites that could be read."""
        return [s for s in self.sites.values() if s]

    def known_telescopes(self) -> list[TelescopeSection]:
        """Return the telescopes that could be read."""
        return [t for t in self.telescopes.values() if t]

    def defaults(self) -> list[Default]:
        """Return the defaults that stand in the schema and were taken."""
        sections: list[tuple[str, Section | None]] = [
            ("campaign", self.programme),
            *(
                ("site" if path == ("site",) else f"sites.{s.name}", s)
                for path, s in self.sites.items()
                if s
            ),
            *((f"telescopes.{t.name}", t) for t in self.known_telescopes()),
            ("streams", self.streams),
            ("limits", self.limits),
            ("", self.candidates),
            ("success", self.success),
            ("simulation", self.simulation),
            ("cosmology", self.cosmology),
        ]
        return [d for prefix, s in sections if s for d in defaults_taken(s, prefix)]


def read_parts(sheet: Sheet, relations: Mapping[str, Sequence[str]] | None) -> Parts:
    """Read every section but the targets; problems are noted in `sheet`."""
    root = sheet.root
    if not isinstance(root.value, dict):
        sheet.fault((), "no sections", "`campaign:`, `targets:`, `site:` and `telescopes:`")
        root = sheet.root = Node(1, {})
    assert isinstance(root.value, dict)
    for key in root.value:
        if key not in TOP_KEYS:
            sheet.unknown((key,), TOP_KEYS)
    sites = _site_places(sheet)
    telescopes = sheet.items(("telescopes",), "a list such as `- {name: C19, aperture: 1.9 m}`")
    sheet.refuse_twins(sites, "site")
    sheet.refuse_twins(telescopes, "telescope")
    if node_at(root, ("campaign",)) is None:
        sheet.fault(("campaign",), "missing", "a section with first_night and last_night")
        programme = None
    else:
        programme = sheet.read(ProgrammeSection, ("campaign",))
    return Parts(
        programme=programme,
        sites={path: sheet.read(SiteSection, path) for path in sites},
        telescopes={path: sheet.read(TelescopeSection, path) for path in telescopes},
        streams=sheet.read(StreamsSection, ("streams",)),
        limits=sheet.read(LimitsSection, ("limits",)),
        candidates=sheet.read(Candidates, ()),
        time=sheet.read(TimeSection, ("time",)),
        success=sheet.read(SuccessSection, ("success",)),
        simulation=sheet.read(SimulationSection, ("simulation",)),
        cosmology=sheet.read(CosmologySection, ("cosmology",)),
        relations=_relations(sheet, relations),
    )


def _site_places(sheet: Sheet) -> list[Place]:
    one, several = (node_at(sheet.root, (key,)) for key in ("site", "sites"))
    if one is not None and several is not None:
        sheet.fault(("sites",), "both `site` and `sites`", "one of the two")
    if several is not None:
        return sheet.items(("sites",), "a list of sites")
    if one is None or one.value is None:
        sheet.fault(("site",), "missing", "a section with name, latitude and longitude")
        return []
    return [("site",)]


def _relations(sheet: Sheet, allowed: Mapping[str, Sequence[str]] | None) -> dict[str, str]:
    """Return the relation chosen for each line; lines without a choice are left out."""
    node = node_at(sheet.root, ("relations",))
    if node is None or node.value is None:
        return {}
    if not isinstance(node.value, dict):
        sheet.fault(("relations",), "no section", f"a relation for any of {', '.join(LINES)}")
        return {}
    chosen: dict[str, str] = {}
    for line, choice in node.value.items():
        path = ("relations", line)
        known = list(allowed.get(line, ())) if allowed is not None else None
        if line not in LINES:
            sheet.unknown(path, LINES)
        elif not isinstance(choice.value, str):
            sheet.fault(path, "no name of a relation", ", ".join(known or ["a name"]))
        elif known is not None and choice.value not in known:
            sheet.fault(path, f"unknown relation {choice.value}", f"one of {', '.join(known)}")
        else:
            chosen[line] = choice.value
    return chosen
