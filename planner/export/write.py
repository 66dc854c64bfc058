"""Tables to files and to plain rows."""

from __future__ import annotations

import io
import math
from pathlib import Path
from typing import Any

from astropy.table import Table

from planner.base.files import write_bytes

__all__ = ["as_rows", "write_csv", "write_ecsv"]


def write_ecsv(table: Table, path: Path) -> None:
    """Write a table as comma-separated ECSV. Raises `OutputError`."""
    text = io.StringIO()
    table.write(text, format="ascii.ecsv", delimiter=",")
    write_bytes(path, text.getvalue().encode())


def write_csv(table: Table, path: Path) -> None:
    """Write a table as CSV with units in the header, safe to open as a spreadsheet.

    A cell of text that a spreadsheet would take for a formula is quoted with an apostrophe.
    Raises `OutputError`.
    """
    safe = table.copy()
    for name in safe.colnames:
        column = safe[name]
        if column.dtype.kind == "U":
            safe[name] = [_no_formula(str(cell)) for cell in column]
    for name in table.colnames:
        if table[name].unit is not None:
            safe.rename_column(name, f"{name} [{table[name].unit}]")
    text = io.StringIO()
    safe.write(text, format="ascii.csv")
    write_bytes(path, text.getvalue().encode())


def _no_formula(cell: str) -> str:
    return f"'{cell}" if cell.startswith(("=", "+", "-", "@", "\t", "\r")) else cell


def as_rows(table: Table) -> list[dict[str, Any]]:
    """Return a table as plain dictionaries, fit for JSON: NaN becomes None."""
    return [{name: _plain(row[name]) for name in table.colnames} for row in table]


def _plain(value: Any) -> Any:
    value = value.item() if hasattr(value, "item") else value
    return None if isinstance(value, float) and not math.isfinite(value) else value
