"""Trials, spread over workers, with finished work kept."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from planner.base.workers import Workers
from planner.model.campaign import Layout
from planner.model.trial import Prospect
from planner.scoring.draws import Setting
from planner.scoring.store import Digests, Store, key_of
from planner.scoring.trials import Task, Used

__all__ = ["CHUNK", "MODEL_VERSION", "Arrays", "Progress", "Row", "Tools", "outcomes"]

MODEL_VERSION = 9
"""Raised whenever the same inputs would give other outcomes; older kept results are then stale."""

CHUNK = 10
"""Trials in one task: small enough to lose little when interrupted."""

TOGETHER = 8
"""Layouts in one task: they share the draws; more would leave workers without work at the end."""

Arrays = dict[str, NDArray[Any]]


class Progress(Protocol):
    """Told what is being done, steps done and steps in all, and a remark."""

    def __call__(self, what: str, done: int, total: int, note: str = "", /) -> None:
        """Show it."""


@dataclass(frozen=True, slots=True)
class Tools:
    """What long work is done with."""

    workers: Workers
    store: Store
    """Finished rows are taken from it and put into it."""
    progress: Progress


@dataclass(frozen=True, slots=True)
class Row:
    """Some trials of one layout of one target: what is worked out, and kept, as a whole."""

    setting: Setting
    prospect: Prospect
    layout: Layout
    first: int
    last: int
    limit: float = -np.inf
    """Correlation that a claim must exceed besides what the rule asks."""
    used: tuple[Used, ...] | None = None
    """None: the target has the telescopes to itself. Else, the nights that a schedule gave it in
    each of the trials."""


def outcomes(
    work: Callable[[Task], Arrays],
    rows: Sequence[Row],
    tools: Tools,
    label: str,
) -> list[Arrays]:
    """Return the arrays of each row, in the order of `rows`.

    Rows that share target and trials are worked out together, for they share the draws; what comes
    out of each depends on itself alone.

    Parameters
    ----------
    work : callable
        Returns arrays (layouts, trials, ...) by name.
    rows : sequence of Row
    tools : Tools
    label : str
        What the progress calls this work.
    """
    if not rows:
        return []
    digests = Digests()
    bare = {id(row.setting): _bare(row.setting) for row in rows}
    keys = [
        key_of(
            MODEL_VERSION,
            work.__name__,
            digests.of(bare[id(row.setting)]),
            digests.of(row.prospect),
            row.layout,
            row.first,
            row.last,
            row.limit,
            row.used,
        )
        for row in rows
    ]
    done = tools.store.get_many(keys)
    groups: dict[tuple[Any, ...], list[int]] = {}
    for i, row in enumerate(rows):
        if keys[i] not in done:
            together = (id(row.setting), id(row.prospect), id(row.used), row.first, row.last)
            groups.setdefault(together, []).append(i)
    parts = [
        mine[i : i + TOGETHER] for mine in groups.values() for i in range(0, len(mine), TOGETHER)
    ]
    finished = len(rows) - sum(map(len, parts))
    tools.progress(label, finished, len(rows))
    for number, arrays in tools.workers.each(work, [_task([rows[i] for i in p]) for p in parts]):
        new = {
            keys[i]: {name: values[at] for name, values in arrays.items()}
            for at, i in enumerate(parts[number])
        }
        tools.store.put_many(new)
        done |= new
        finished += len(new)
        tools.progress(label, finished, len(rows))
    return [done[key] for key in keys]


def _bare(setting: Setting) -> Setting:
    """Return a setting without what no single outcome depends on."""
    return replace(
        setting,
        simulation=replace(setting.simulation, trials=0),
        success=replace(setting.success, goal=0.0, robust_to=()),
    )


def _task(rows: Sequence[Row]) -> Task:
    """Return one task for rows that share everything but layout and limit."""
    row = rows[0]
    return Task(
        row.setting,
        row.prospect,
        tuple(r.layout for r in rows),
        row.used,
        row.first,
        row.last,
        tuple(r.limit for r in rows),
    )
