"""All trials of all targets, spread over workers, with finished work kept."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.base.workers import each
from planner.model.campaign import Layout
from planner.model.trial import Prospect, TrialTable
from planner.scoring.draws import Setting
from planner.scoring.executed import run_executed
from planner.scoring.recovering import CHANCE
from planner.scoring.store import Store, key_of
from planner.scoring.trials import Used, run_trials

__all__ = ["MODEL_VERSION", "Job", "Progress", "Used", "score_targets"]

MODEL_VERSION = 3
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


@dataclass(frozen=True, slots=True)
class _Task:
    setting: Setting
    prospect: Prospect
    layouts: tuple[Layout, ...]
    used: tuple[Used, ...] | None
    first: int
    last: int


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
    tasks: list[_Task] = []
    of_job: list[slice] = []
    for job in jobs:
        start = len(tasks)
        for first, last in _chunks(job.setting.simulation.trials):
            used = None if job.used is None else job.used[first:last]
            tasks.append(_Task(job.setting, job.prospect, job.layouts, used, first, last))
        of_job.append(slice(start, len(tasks)))
    done = _all_done(tasks, workers, store, progress, label)
    return [_table(job, done[rows]) for job, rows in zip(jobs, of_job, strict=True)]


def _chunks(trials: int) -> list[tuple[int, int]]:
    return [(first, min(first + CHUNK, trials)) for first in range(0, trials, CHUNK)]


def _work(task: _Task) -> Arrays:
    if task.used is None:
        return run_trials(task.setting, task.prospect, task.layouts, task.first, task.last)
    return run_executed(task.setting, task.prospect, task.layouts[0], task.used, task.first)


def _all_done(
    tasks: list[_Task], workers: int, store: Store, progress: Progress, label: str
) -> list[Arrays]:
    """Return each task's arrays, from the store where they are there."""
    keys = [key_of(MODEL_VERSION, task) for task in tasks]
    done: dict[int, Arrays] = {}
    for i, key in enumerate(keys):
        kept = store.get(key)
        if kept is not None:
            done[i] = kept
    missing = [i for i in range(len(tasks)) if i not in done]
    progress(label, len(done), len(tasks))
    for i, arrays in each(_work, [tasks[i] for i in missing], workers):
        store.put(keys[missing[i]], arrays)
        done[missing[i]] = arrays
        progress(label, len(done), len(tasks))
    return [done[i] for i in range(len(tasks))]


def _drop_chance(joined: Arrays, setting: Setting) -> None:
    """Withdraw claims whose correlation unrelated lines reach too often on the same layout."""
    share = setting.success.false_alarm_below
    if share >= 1.0 or setting.simulation.method != "correlation":
        return
    reached = np.nan_to_num(joined["r_unrelated"], nan=-1.0)
    limit = np.quantile(reached.reshape(len(reached), -1), 1.0 - share, axis=1)
    chance = (joined["claim"] > 0) & (joined["r_max"] <= limit[:, None])
    joined["claim"] = joined["claim"] * ~chance
    joined["success"] = joined["success"] * ~chance
    joined["reason"] = np.where(chance, CHANCE, joined["reason"])


def _table(job: Job, parts: list[Arrays]) -> TrialTable:
    """Join the chunks of one job."""
    joined = {name: np.concatenate([p[name] for p in parts], axis=1) for name in parts[0]}
    _drop_chance(joined, job.setting)
    return TrialTable(
        target=job.prospect.forecast.name,
        layouts=job.layouts,
        lag_true_d=joined["lag_true_d"],
        lag_d=joined["lag_d"],
        lag_lo_d=joined["lag_lo_d"],
        lag_hi_d=joined["lag_hi_d"],
        r_max=joined["r_max"],
        r_unrelated=joined["r_unrelated"],
        epochs_line=joined["epochs_line"].astype(np.int64),
        epochs_continuum=joined["epochs_continuum"].astype(np.int64),
        hours=joined["hours"],
        hours_line=joined["hours_line"],
        hours_shutter=joined["hours_shutter"],
        claim=joined["claim"].astype(bool),
        success=joined["success"].astype(bool),
        reason=joined["reason"].astype(np.int8),
    )
