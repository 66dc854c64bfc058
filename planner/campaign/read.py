"""Reading a campaign: file to record, or every problem at once."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from planner.base.errors import InputError, Problem
from planner.campaign.build import build
from planner.campaign.checks import check
from planner.campaign.input_files import as_text, read_bytes
from planner.campaign.parts import read_parts
from planner.campaign.sections import Default
from planner.campaign.settle import settle
from planner.campaign.sheet import Sheet
from planner.campaign.target_lists import read_targets
from planner.campaign.yaml_nodes import parse
from planner.model.campaign import Campaign

__all__ = ["Reading", "read_campaign"]


@dataclass(frozen=True, slots=True)
class Reading:
    """A campaign and how it was understood."""

    campaign: Campaign
    defaults: tuple[Default, ...]
    """Every value that was not given."""
    notes: tuple[str, ...]
    """What was read in a way that the observer may want to know."""
    files: tuple[Path, ...]
    """Every file that was read."""


def read_campaign(path: Path, relations: Mapping[str, Sequence[str]] | None = None) -> Reading:
    """Read a campaign file and the target list that it names.

    Parameters
    ----------
    path : Path
        The campaign file, YAML. The path of a target list is relative to its folder.
    relations : mapping, optional
        For each line the names of the radius-luminosity relations that may be asked for, the
        usual one first. Without it any name is taken, and none is the default.

    Returns
    -------
    Reading
        The record with defaults, notes and files.

    Raises
    ------
    InputError
        With all problems of the file and of the list, in the order of their lines.
    """
    try:
        text = as_text(read_bytes(path))
    except ValueError as error:
        found, _, expected = str(error).partition("; expected ")
        raise InputError(Problem(str(path), None, "", found, expected)) from None
    sheet = Sheet(str(path), parse(text, str(path)))
    parts = read_parts(sheet, relations)
    found_targets = read_targets(sheet, path.parent)
    choices = settle(parts)
    check(sheet, parts, choices)
    if sheet.problems:
        raise InputError(sorted(sheet.problems, key=lambda p: (p.file != str(path), p.line or 0)))
    campaign = build(parts, choices, found_targets.targets, relations, path.stem)
    used = {feed.telescope for s in (campaign.continuum, campaign.line) for feed in s.feeds}
    idle = [t.name for t in campaign.telescopes if t.name not in used]
    notes = [*sheet.notes, *(f"{path}: no stream uses the telescope {name}" for name in idle)]
    files = (path,) if found_targets.file is None else (path, found_targets.file)
    defaults = (*parts.defaults(), *choices.defaults, *found_targets.defaults)
    return Reading(campaign, defaults, tuple(notes), files)
