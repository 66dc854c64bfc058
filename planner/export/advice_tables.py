"""Tables of what stands behind the advice: wants, helps, sensitivity, best lists of targets."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from astropy.table import Table

from planner.export.columns import rounded, table_of
from planner.export.tables import layout_columns
from planner.model.plan import Recommendation, Sensitivity, Subset

__all__ = ["causes_table", "helps_table", "sensitivity_table", "subsets_table"]

CONFIDENT = "90 % confidence"


def _text(values: Sequence[str]) -> np.ndarray:
    return np.array(values, dtype=str)


def causes_table(recommendations: Sequence[Recommendation]) -> Table:
    """Return what the failed trials of each recommended layout fail for want of."""
    rows = [(r.target, c) for r in recommendations for c in r.causes]
    return table_of(
        [
            ("target", _text([name for name, _ in rows]), None, "name"),
            ("want", _text([c.want for _, c in rows]), None, "what mends the failed trials"),
            ("share", rounded([c.share for _, c in rows], 4), None, "of the failed trials"),
        ]
    )


def helps_table(recommendations: Sequence[Recommendation]) -> Table:
    """Return the changes tried on each best layout that misses the goal, the most worth first."""
    rows = [(r.target, h) for r in recommendations for h in r.helps]
    return table_of(
        [
            ("target", _text([name for name, _ in rows]), None, "name"),
            ("change", _text([h.change for _, h in rows]), None, "to the best layout"),
            ("success", rounded([h.success for _, h in rows], 4), None, "with the change"),
            ("gain", rounded([h.gain for _, h in rows], 4), None, "trial by trial"),
            ("gain_lo", rounded([h.gain_lo for _, h in rows], 4), None, f"lower end, {CONFIDENT}"),
            ("gain_hi", rounded([h.gain_hi for _, h in rows], 4), None, f"upper end, {CONFIDENT}"),
            ("hours", rounded([h.hours for _, h in rows], 2), "h", "clock hours added"),
            (
                "gain_per_hour",
                rounded([h.per_hour for _, h in rows], 5),
                "1 / h",
                "less than an hour counts as one",
            ),
            ("trials", [h.trials for _, h in rows], None, "pairs of simulated campaigns"),
        ]
    )


def sensitivity_table(found: Mapping[str, Sequence[Sensitivity]]) -> Table:
    """Return the success of each recommended layout where one uncertain factor is held."""
    rows = [(name, s) for name, mine in found.items() for s in mine]
    return table_of(
        [
            ("target", _text([name for name, _ in rows]), None, "name"),
            ("factor", _text([s.factor for _, s in rows]), None, "what is held"),
            (
                "level",
                _text([s.level for _, s in rows]),
                None,
                "its 10th, 50th or 90th percentile; or the relation",
            ),
            (
                "value",
                rounded([s.value for _, s in rows], 3),
                None,
                "standard deviations of the logarithm; usable nights; lag in days, observed",
            ),
            ("success", rounded([s.success for _, s in rows], 4), None, "NaN: not to be told"),
            (
                "success_lo",
                rounded([s.success_lo for _, s in rows], 4),
                None,
                "lower end of the central 90 %",
            ),
            (
                "success_hi",
                rounded([s.success_hi for _, s in rows], 4),
                None,
                "upper end of the central 90 %",
            ),
        ]
    )


def subsets_table(subsets: Sequence[Subset]) -> Table:
    """Return the best list of targets for each number of hours, one row a target."""
    rows = [(s, name, layout) for s in subsets for name, layout in s.chosen]
    return table_of(
        [
            ("hours", rounded([s.hours for s, _, _ in rows], 1), "h", "that may be spent"),
            ("target", _text([name for _, name, _ in rows]), None, "name"),
            *layout_columns([layout for _, _, layout in rows]),
            ("spent", rounded([s.spent for s, _, _ in rows], 1), "h", "by the whole list"),
            ("lags", rounded([s.lags for s, _, _ in rows], 2), None, "expected of the whole list"),
            ("lags_lo", rounded([s.lags_lo for s, _, _ in rows], 1), None, "10th percentile"),
            ("lags_hi", rounded([s.lags_hi for s, _, _ in rows], 1), None, "90th percentile"),
        ]
    )
