"""The list of targets, wherever it stands: inline, in YAML or in a table."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

from planner.base.errors import InputError
from planner.base.quantities import shown
from planner.campaign.input_files import as_text, read_bytes
from planner.campaign.sections import Default, defaults_taken
from planner.campaign.sheet import Sheet
from planner.campaign.tables import Table, read_csv, read_ecsv, read_votable, rows_of
from planner.campaign.target_schema import read_target
from planner.campaign.yaml_nodes import Node, Place, node_at, parse
from planner.model.target import Target

__all__ = ["TargetList", "read_targets"]

_EXPECTED = "a list of targets, or the path of one (.yaml, .csv, .ecsv or .xml)"
_YAML = (".yaml", ".yml")
_VOTABLE = (".xml", ".vot", ".votable")


@dataclass
class TargetList:
    """The targets that could be read, the defaults they took and the file they stand in."""

    targets: list[Target] = field(default_factory=list)
    defaults: list[Default] = field(default_factory=list)
    file: Path | None = None


def read_targets(campaign: Sheet, folder: Path) -> TargetList:
    """Read what stands under ``targets`` in the campaign file.

    Parameters
    ----------
    campaign : Sheet
        The campaign file. Problems and notes of a list in another file go there too.
    folder : Path
        Where relative paths start.

    Returns
    -------
    TargetList
        In the order of the list; those with problems are left out.
    """
    given = node_at(campaign.root, ("targets",))
    if given is None or not isinstance(given.value, str):
        return _targets_in(campaign, ("targets",), None)
    path = folder / given.value
    try:
        content = read_bytes(path)
        kind = _kind(path, content)
        if kind in _YAML:
            text = as_text(content)
        else:
            table = _reader(kind)(content)
    except ValueError as error:
        found, _, expected = str(error).partition("; expected ")
        campaign.fault(("targets",), f"{shown(str(path), 400)}: {found}", expected)
        return TargetList()
    sheet = Sheet(str(path), Node(None, None), campaign.problems, campaign.notes)
    place: Place = ()
    if kind in _YAML:
        try:
            sheet.root = parse(text, sheet.file)
        except InputError as error:
            campaign.problems.extend(error.problems)
            return TargetList(file=path)
        place = _list_in_yaml(sheet)
    else:
        sheet.rows = True
        rows_of(sheet, table)
    return _targets_in(sheet, place, path)


def _kind(path: Path, content: bytes) -> str:
    """Return the ending that tells the format; content that is unmistakable goes before it."""
    if content.startswith(b"# %ECSV"):
        return ".ecsv"
    ending = path.suffix.lower()
    if ending in (*_YAML, ".csv", ".ecsv", *_VOTABLE):
        return ending
    raise ValueError(
        f"the ending '{ending}' tells no format; expected one of "
        f"{', '.join((*_YAML, '.csv', '.ecsv', *_VOTABLE))}"
    )


def _reader(kind: str) -> Callable[[bytes], Table]:
    return {".csv": read_csv, ".ecsv": read_ecsv}.get(kind, read_votable)


def _list_in_yaml(sheet: Sheet) -> Place:
    """Return the place of the list: the whole file, or under the one key ``targets``."""
    if not isinstance(sheet.root.value, dict):
        return ()
    for key in sheet.root.value:
        if key != "targets":
            sheet.unknown((key,), ("targets",))
    return ("targets",)


def _targets_in(sheet: Sheet, place: Place, file: Path | None) -> TargetList:
    found = TargetList(file=file)
    places = sheet.items(place, _EXPECTED)
    sheet.refuse_twins(places, "target")
    taken: Counter[Default] = Counter()
    for path in places:
        read = read_target(sheet, path)
        if read is not None:
            section, target = read
            found.targets.append(target)
            taken.update(defaults_taken(section, "targets"))
    total = len(places)
    for default, times in taken.items():
        which = "all targets" if times == total else f"{times} of {total} targets"
        found.defaults.append(Default(default.key, default.value, f"{default.reason}; {which}"))
    return found
