"""All trials of all targets, spread over workers, with finished work kept."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from itertools import islice
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.base.workers import each
from planner.model.campaign import Layout
from planner.model.trial import Prospect, TrialTable
from planner.scoring.draws import Setting
from planner.scoring.store import Store, key_of
from planner.scoring.trials import Task, Used, run_strangers, run_trials

__all__ = ["MODEL_VERSION", "Job", "Progress", "Used", "score_targets"]

MODEL_VERSION = 7
"""Raised whenever the same inputs would give other outcomes; older kept results are then stale."""

CHUNK = 10
"""Trials in one task: small enough to lose little when interrupted."""

Progress = Callable[[str, int, int], None]
"""Called with what is being done, tasks done and tasks in all."""

Arrays = dict[str, NDArray[Any]]


@dataclass(frozen=True, slots=True)
class Job:
    """One target's trials."""

    setting: Setting
    prospect: Prospect
    layouts: tuple[Layout, ...]
    used: tuple[Used, ...] | None = None
    """None: the target has the telescopes to itself. Else the nights that a schedule gave it; then
    there is one layout."""


def score_targets(
    jobs: Sequence[Job], *, workers: int, store: Store, progress: Progress, label: str
) -> list[TrialTable]:
    """Run every trial of every layout of every target.

    Parameters
    ----------
    jobs : sequence of Job
    workers : int
        Processes; the results do not depend on it.
    store : Store
        Finished chunks of trials are taken from it and put into it.
    progress : callable
    label : str
        What the progress line calls this work.

    Returns
    -------
    list of TrialTable
        In the order of `jobs`.
    """
    limits = _limits(jobs, workers, store, progress)
    tasks = [
        replace(task, limits=limit)
        for job, limit in zip(jobs, limits, strict=True)
        for task in _tasks(job)
    ]
    done = iter(_all_done(run_trials, tasks, workers, store, progress, label))
    return [_table(job, list(islice(done, len(_tasks(job))))) for job in jobs]


def _tasks(job: Job) -> list[Task]:
    """Cut a job's trials into tasks."""
    trials = job.setting.simulation.trials
    ends = [(first, min(first + CHUNK, trials)) for first in range(0, trials, CHUNK)]
    return [
        Task(
            job.setting,
            job.prospect,
            job.layouts,
            None if job.used is None else job.used[first:last],
            first,
            last,
        )
        for first, last in ends
    ]


def _limits(
    jobs: Sequence[Job], workers: int, store: Store, progress: Progress
) -> list[tuple[float, ...] | None]:
    """Return, for each layout of each job, the correlation that unrelated lines seldom exceed.

    None for jobs whose rule does not ask for it, or whose method has odds of its own. The limit
    stands one standard error of its own above the quantile asked for, as it is found from a finite
    number of lines.
    """
    asked = [
        job
        for job in jobs
        if job.setting.success.false_alarm_below < 1.0
        and job.setting.simulation.method == "correlation"
    ]
    tasks = [task for job in asked for task in _tasks(job)]
    done = iter(_all_done(run_strangers, tasks, workers, store, progress, "unrelated lines"))
    limits = {}
    for job in asked:
        parts = [part["r_unrelated"] for part in islice(done, len(_tasks(job)))]
        reached = np.nan_to_num(np.concatenate(parts, axis=1), nan=-1.0)
        reached = reached.reshape(len(reached), -1)
        share = job.setting.success.false_alarm_below
        error = (share * (1.0 - share) / reached.shape[1]) ** 0.5
        limit = np.quantile(reached, 1.0 - max(share - error, 0.0), axis=1)
        limits[id(job)] = tuple(float(r) for r in limit)
    return [limits.get(id(job)) for job in jobs]


def _all_done(
    work: Callable[[Task], Arrays],
    tasks: Sequence[Task],
    workers: int,
    store: Store,
    progress: Progress,
    label: str,
) -> list[Arrays]:
    """Return each task's arrays, from the store where they are there."""
    if not tasks:
        return []
    keys = [key_of(MODEL_VERSION, work.__name__, task) for task in tasks]
    done: dict[int, Arrays] = {}
    for i, key in enumerate(keys):
        kept = store.get(key)
        if kept is not None:
            done[i] = kept
    missing = [i for i in range(len(tasks)) if i not in done]
    progress(label, len(done), len(tasks))
    for i, arrays in each(work, [tasks[i] for i in missing], workers):
        store.put(keys[missing[i]], arrays)
        done[missing[i]] = arrays
        progress(label, len(done), len(tasks))
    return [done[i] for i in range(len(tasks))]


def _table(job: Job, parts: list[Arrays]) -> TrialTable:
    """Join the chunks of one job."""
    joined = {name: np.concatenate([p[name] for p in parts], axis=1) for name in parts[0]}
    return TrialTable(
        target=job.prospect.forecast.name,
        layouts=job.layouts,
        lag_true_d=joined["lag_true_d"],
        lag_d=joined["lag_d"],
        lag_lo_d=joined["lag_lo_d"],
        lag_hi_d=joined["lag_hi_d"],
        r_max=joined["r_max"],
        epochs_line=joined["epochs_line"].astype(np.int64),
        epochs_continuum=joined["epochs_continuum"].astype(np.int64),
        hours=joined["hours"],
        hours_line=joined["hours_line"],
        hours_shutter=joined["hours_shutter"],
        claim=joined["claim"].astype(bool),
        success=joined["success"].astype(bool),
        reason=joined["reason"].astype(np.int8),
    )
