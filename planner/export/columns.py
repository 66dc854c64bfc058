"""Columns of tables: units, descriptions, sensible digits."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from astropy.table import Column, Table

__all__ = ["Spec", "dates", "rounded", "significant", "table_of"]

Spec = tuple[str, Any, str | None, str]
"""Column name, values, unit, description."""


def table_of(columns: Sequence[Spec], **meta: Any) -> Table:
    """Return a table of columns with units and descriptions."""
    table = Table(meta=meta)
    for name, values, unit, description in columns:
        table[name] = Column(np.asarray(values), unit=unit, description=description)
    return table


def rounded(values: Any, digits: int) -> Any:
    """Return values with so many decimals."""
    return np.round(np.asarray(values, dtype=float), digits)


def dates(nights: Any) -> Any:
    """Return the ISO dates of nights given as the MJD of their evening's date."""
    return (np.datetime64("1858-11-17") + np.asarray(nights).astype("timedelta64[D]")).astype(str)


def significant(values: Any, digits: int = 3) -> Any:
    """Return values with so many significant digits."""
    return np.array([float(f"{v:.{digits}g}") for v in np.asarray(values, float)])
