"""A fixed number of trials of single layouts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.trial import Prospect, TrialTable
from planner.scoring.draws import Setting
from planner.scoring.limits import limits_of
from planner.scoring.run import CHUNK, Arrays, Row, Tools, outcomes
from planner.scoring.trials import Used, run_trials

__all__ = ["Job", "chunks", "score_jobs", "table_of"]


@dataclass(frozen=True, slots=True)
class Job:
    """Trials of one layout of one target."""

    setting: Setting
    prospect: Prospect
    layout: Layout
    trials: int
    used: tuple[Used, ...] | None = None
    """None: the target has the telescopes to itself. Else the nights that a schedule gave it in
    each trial."""
    limit: float | None = None
    """Correlation that a claim must exceed besides what the rule asks; None: found out."""


def chunks(first: int, last: int) -> list[tuple[int, int]]:
    """Cut trials into those of single tasks; `first` is a multiple of `CHUNK`."""
    return [(a, min(a + CHUNK, last)) for a in range(first, last, CHUNK)]


def score_jobs(jobs: Sequence[Job], tools: Tools, label: str) -> list[TrialTable]:
    """Run the trials of each job; tables of one layout, in the order of `jobs`."""
    unknown = [(j.setting, j.prospect, j.layout) for j in jobs if j.limit is None]
    found = iter(limits_of(unknown, tools))
    limits = [next(found) if job.limit is None else job.limit for job in jobs]
    rows = [
        Row(
            job.setting,
            job.prospect,
            job.layout,
            a,
            b,
            limit,
            None if job.used is None else job.used[a:b],
        )
        for job, limit in zip(jobs, limits, strict=True)
        for a, b in chunks(0, job.trials)
    ]
    done = iter(outcomes(run_trials, rows, tools, label))
    return [
        table_of(
            job.prospect.forecast.name,
            (job.layout,),
            [[next(done) for _ in chunks(0, job.trials)]],
            most=0,
        )
        for job in jobs
    ]


_WHOLE = ("epochs_line", "epochs_continuum")
_FLAGS = ("claim", "success")
_KINDS = {**dict.fromkeys(_WHOLE, np.int64), **dict.fromkeys(_FLAGS, np.bool_), "reason": np.int8}
COLUMNS = (
    "lag_true_d", "lag_d", "lag_lo_d", "lag_hi_d", "r_max", "epochs_line", "epochs_continuum",
    "hours", "hours_line", "hours_shutter", "claim", "success", "reason",
)  # fmt: skip


def table_of(
    target: str, layouts: tuple[Layout, ...], parts: Sequence[Sequence[Arrays]], most: int
) -> TrialTable:
    """Join the chunks of each layout of one target; layouts may have other numbers of trials."""
    trials = np.array([sum(part["claim"].size for part in mine) for mine in parts], dtype=np.int64)
    columns: dict[str, NDArray[Any]] = {}
    for name in COLUMNS:
        kind = _KINDS.get(name, np.float64)
        nothing = np.nan if kind is np.float64 else 0
        column: NDArray[Any] = np.full(
            (len(layouts), int(trials.max(initial=0))), nothing, dtype=kind
        )
        for i, mine in enumerate(parts):
            if mine:
                column[i, : trials[i]] = np.concatenate([part[name] for part in mine])
        columns[name] = column
    return TrialTable(target, layouts, trials, most, **columns)
