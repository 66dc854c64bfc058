"""An observer's own light curves."""

from __future__ import annotations

import math
from pathlib import Path
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import InputError, Problem
from planner.campaign.input_files import read_bytes
from planner.campaign.tables import read_csv, read_ecsv

__all__ = ["LightCurve", "read_light_curve"]

LARGEST = 1e100
"""Squares of larger numbers overflow."""

COLUMNS = ("time", "flux", "flux_error")


class LightCurve(NamedTuple):
    """One light curve; arrays of shape (epochs,)."""

    time_d: NDArray[np.float64]
    """Days: MJD or JD, the same in both curves."""
    flux: NDArray[np.float64]
    error: NDArray[np.float64]


def read_light_curve(path: Path) -> LightCurve:
    """Read a light curve from CSV or ECSV with columns ``time``, ``flux`` and ``flux_error``.

    Raises
    ------
    InputError
        With every problem found.
    """
    try:
        content = read_bytes(path)
        table = read_ecsv(content) if path.suffix.lower() == ".ecsv" else read_csv(content)
    except ValueError as error:
        raise InputError(f"{path}: {error}") from None
    missing = [name for name in COLUMNS if name not in table.columns]
    if missing:
        raise InputError(
            f"{path}: found no column {', '.join(missing)}; expected columns {', '.join(COLUMNS)}"
        )
    problems: list[Problem] = []
    values = np.array(
        [
            [
                _number(path, line, name, row[table.columns.index(name)], problems)
                for name in COLUMNS
            ]
            for row, line in zip(table.rows, table.lines, strict=True)
        ]
    ).reshape(-1, len(COLUMNS))
    if problems:
        raise InputError(problems)
    return LightCurve(*values.T)


def _number(
    path: Path, line: int | None, name: str, cell: str | None, problems: list[Problem]
) -> float:
    """Return a cell as a number, or note why it is none."""
    try:
        value = float(cell or "nothing")
    except ValueError:
        value = math.nan
    if not abs(value) < LARGEST or (name == "flux_error" and not value > 0):
        expected = "a number above 0" if name == "flux_error" else "a number below 1e100"
        problems.append(Problem(str(path), line, name, f"found {cell or 'nothing'}", expected))
    return value
