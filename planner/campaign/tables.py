"""Target lists as tables: CSV, ECSV or VOTable to the same tree that YAML gives.

Column names are the keys of a target, joined by ``_`` where they are nested; a unit stands in the
table or behind the name in brackets. A missing cell is an absent key. The usual catalogue names of
columns are understood, with a note.
"""

from __future__ import annotations

import csv
import io
import re
import warnings
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from planner.campaign.input_files import as_text
from planner.campaign.sections import nearest
from planner.campaign.sheet import Sheet
from planner.campaign.target_schema import TargetSection
from planner.campaign.yaml_nodes import Node

__all__ = ["Table", "read_csv", "read_ecsv", "read_votable", "rows_of"]

_NESTED = {
    "magnitude_band": ("magnitude", "band"),
    "magnitude_value": ("magnitude", "value"),
    "variability_amplitude": ("variability", "amplitude"),
    "variability_timescale": ("variability", "timescale"),
}
_COLUMNS = (
    *(k for k in TargetSection.model_fields if k not in {"magnitude", "variability"}),
    *_NESTED,
)
_ALIASES = {
    "id": "name", "object": "name", "target": "name", "source": "name", "main_id": "name",
    "raj2000": "ra", "_raj2000": "ra", "ra_icrs": "ra", "_ra": "ra", "ra_deg": "ra",
    "dej2000": "dec", "_dej2000": "dec", "de_icrs": "dec", "_de": "dec", "dec_deg": "dec",
    "decj2000": "dec", "de": "dec",
    "z": "redshift", "z_spec": "redshift", "zsp": "redshift",
    "magnitude": "magnitude_value", "mag": "magnitude_value", "band": "magnitude_band",
    "filter": "magnitude_band", "e(b-v)": "ebv", "e_bv": "ebv", "fwhm": "line_width",
    "ew": "line_equivalent_width", "rfe": "iron_strength", "r_fe": "iron_strength",
    "logl5100": "log_luminosity_5100", "logl3000": "log_luminosity_3000",
    "logl1350": "log_luminosity_1350", "comment": "notes", "comments": "notes",
}  # fmt: skip
_HEADER = re.compile(r"(?P<name>.+?)\s*(?:\[(?P<unit>[^\[\]]*)\])?")
_BARE = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_UNIT_NEEDED = {
    "line_width": "km/s", "line_equivalent_width": "angstrom", "mass": "Msun",
    "variability_timescale": "d", "lag_rest": "d",
}  # fmt: skip
_UNITLESS = {"name", "notes", "line", "magnitude_band", "redshift"}


@dataclass(frozen=True, slots=True)
class Table:
    """A table as text: None is a missing cell, a line number None is not known."""

    columns: list[str]
    units: list[str]
    rows: list[list[str | None]]
    lines: list[int | None]


def rows_of(sheet: Sheet, table: Table) -> None:
    """Set the sheet's tree to the rows of `table`, one target each; note wrong columns."""
    keys = _keys_of(sheet, table.columns)
    degrees: list[str] = []
    for c, (key, unit) in enumerate(zip(keys, table.units, strict=True)):
        if unit or not _all_bare(row[c] for row in table.rows):
            continue
        if key in {"ra", "dec"}:
            degrees.append(key)
            sheet.notes.append(f"{sheet.file}: {key} without a unit is read as degrees")
        elif key in _UNIT_NEEDED:
            header = f"a header with the unit, such as {key} [{_UNIT_NEEDED[key]}]"
            sheet.fault((), f"the column {key} has no unit", header)
            keys[c] = ""  # said once for the column, not again for each row
    units = ["deg" if key in degrees else u for key, u in zip(keys, table.units, strict=True)]
    sheet.root = Node(
        None,
        [
            Node(line, _target(keys, units, row, line))
            for row, line in zip(table.rows, table.lines, strict=True)
        ],
    )


def _keys_of(sheet: Sheet, columns: Sequence[str]) -> list[str]:
    """Return the target key of each column; ``""`` for one that is not known."""
    keys: list[str] = []
    for column in columns:
        lower = column.strip().lower()
        key = lower if lower in _COLUMNS else _ALIASES.get(lower, "")
        if not key:
            guess = nearest(column, (*_COLUMNS, *_ALIASES))
            found = f"unknown column `{column}`" + (f"; did you mean `{guess}`?" if guess else "")
            sheet.fault((), found, "" if guess else f"columns among {', '.join(_COLUMNS)}")
        elif key in keys:
            both = f"{columns[keys.index(key)]} and {column}"
            sheet.fault((), f"two columns for {key}: {both}", "one of them")
        elif key != lower:
            sheet.notes.append(f"{sheet.file}: column {column} is read as {key}")
        keys.append(key)
    return keys


def _all_bare(cells: Iterator[str | None]) -> bool:
    given = [cell for cell in cells if cell is not None]
    return bool(given) and all(_BARE.fullmatch(cell) for cell in given)


def _target(
    keys: list[str], units: list[str], row: list[str | None], line: int | None
) -> dict[str, Node]:
    """Return the keys and texts of one row, as they would stand in YAML."""
    target: dict[str, Node] = {}
    for key, unit, cell in zip(keys, units, row, strict=True):
        if cell is None or not key:
            continue
        bare = unit and key not in _UNITLESS and _BARE.fullmatch(cell)
        node = Node(line, f"{cell} {unit}" if bare else cell)
        if key in _NESTED:
            outer, inner = _NESTED[key]
            section = target.setdefault(outer, Node(line, {})).value
            assert isinstance(section, dict)
            section[inner] = node
        else:
            target[key] = node
    return target


def read_csv(content: bytes) -> Table:
    """Read comma-, semicolon- or tab-separated text with a header; lines with ``#`` are comments.

    Raises
    ------
    ValueError
        If the text is no such table; the message begins with the line where that shows.
    """
    text = as_text(content)
    # A comment becomes an empty line, so that the reader's count of lines stays true.
    lines = ["\n" if line.startswith("#") else line for line in io.StringIO(text, newline="")]
    header = next((line for line in lines if line.strip()), "")
    separator = max(",;\t", key=header.count)
    reader = csv.reader(lines, delimiter=separator, skipinitialspace=True, strict=True)
    try:
        read = [(reader.line_num, [cell.strip() for cell in cells]) for cells in reader]
    except csv.Error as error:
        raise ValueError(
            f"line {reader.line_num} cannot be read ({error}); expected cells with closed quotes"
        ) from None
    found = [(line, cells) for line, cells in read if any(cells)]
    if not found:
        raise ValueError("nothing but comments; expected a header and rows")
    names, units = _headers(found[0][1])
    for line, cells in found[1:]:
        if len(cells) != len(names):
            raise ValueError(
                f"line {line} has {len(cells)} cells; expected {len(names)} as in the header"
            )
    rows = [[cell or None for cell in cells] for _, cells in found[1:]]
    return Table(names, units, rows, [line for line, _ in found[1:]])


def _headers(cells: list[str]) -> tuple[list[str], list[str]]:
    """Split ``ra [deg]`` into name and unit."""
    matches = [_HEADER.fullmatch(cell) for cell in cells]
    names = [m["name"] if m else cell for m, cell in zip(matches, cells, strict=True)]
    return names, [(m["unit"] or "").strip() if m else "" for m in matches]


def read_ecsv(content: bytes) -> Table:
    """Read an ECSV table.

    Raises
    ------
    ValueError
        If the text is no such table.
    """
    lines = as_text(content).replace("\r\n", "\n").split("\n")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # remarks on units and dates that nobody can act on
        from astropy.table import Table as AstropyTable

        try:
            table = AstropyTable.read(lines, format="ascii.ecsv")
        except Exception as error:  # noqa: BLE001 (the reader lets through what its parsers raise)
            raise ValueError(f"is no ECSV table ({_first_line(error)}); expected ECSV") from None
    numbered = enumerate(lines, start=1)
    rows = [n for n, line in numbered if line.strip() and not line.startswith("#")][1:]
    return _from_astropy(table, rows)


def read_votable(content: bytes) -> Table:
    """Read the first table of a VOTable.

    Raises
    ------
    ValueError
        If the content is no VOTable, or points to data elsewhere: nothing is fetched.
    """
    if re.search(rb"<!(?:ENTITY|DOCTYPE)", content):
        raise ValueError("defines XML entities; expected a VOTable without a DOCTYPE")
    if re.search(rb"<(?:\w+:)?STREAM\b[^>]*\bhref", content):
        raise ValueError("keeps its data elsewhere (STREAM href); expected the data in the file")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # remarks on the standard's fine print
        from astropy.io import votable

        try:
            parsed = votable.parse(io.BytesIO(content), verify="ignore")
            table = parsed.get_first_table().to_table(use_names_over_ids=True)
        except Exception as error:  # noqa: BLE001 (the reader lets through what its parsers raise)
            raise ValueError(f"is no VOTable ({_first_line(error)}); expected VOTable") from None
    return _from_astropy(table, [])


def _first_line(error: Exception) -> str:
    lines = str(error).strip().splitlines()
    return lines[0][:100] if lines else type(error).__name__


def _from_astropy(table: Any, lines: list[int]) -> Table:
    """Return the texts and units of an astropy table."""
    names, units = _headers(list(table.colnames))
    for c, name in enumerate(table.colnames):
        unit = getattr(table[name], "unit", None)
        units[c] = str(unit) if unit is not None and str(unit) else units[c]
    columns = [_cells(table[name]) for name in table.colnames]
    rows = [list(cells) for cells in zip(*columns, strict=True)]
    return Table(names, units, rows, [*lines] if len(lines) == len(rows) else [None] * len(rows))


def _cells(column: Any) -> list[str | None]:
    """Return the column's texts; masked cells, empty texts and NaN are missing."""
    import numpy as np

    values = getattr(column, "value", column)
    mask = np.asarray(getattr(column, "mask", np.zeros(len(values), dtype=bool)))
    cells: list[str | None] = []
    for value, masked in zip(np.ma.getdata(getattr(values, "unmasked", values)), mask, strict=True):
        text = value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value)
        missing = bool(np.all(masked)) or not text.strip() or text == "nan"
        cells.append(None if missing else text.strip())
    return cells
