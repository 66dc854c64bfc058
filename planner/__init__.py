"""A planner for reverberation-mapping campaigns.

Give it targets and a site in YAML; it says which targets to observe, at what cadence, for how long,
with how much telescope time, and how likely each lag is to be measured. ``planner.plan(path)`` does
the main job; the command ``planner plan`` does the same and writes the results into a folder.
Not for the analysis of finished campaigns.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from planner.model.plan import Plan

__all__ = ["plan"]


def plan(path: str | Path, *, workers: int = 1, seed: int | None = None) -> Plan:
    """Plan the campaign described in a file.

    Parameters
    ----------
    path : str or Path
        Campaign file (YAML).
    workers : int
        Processes to use; the results do not depend on it.
    seed : int, optional
        Replaces the file's seed.

    Returns
    -------
    planner.model.plan.Plan

    Raises
    ------
    planner.base.errors.InputError
        If the file cannot be used; carries every problem found.
    planner.base.errors.PlanError
        If no plan can be made.
    """
    from planner.pipeline import make_plan, read, tools_with

    with tools_with(workers) as tools:
        return make_plan(read(Path(path), seed), tools)
