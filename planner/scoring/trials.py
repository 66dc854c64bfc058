"""One trial after another: draw, observe, recover, judge."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.kernels.epochs import nights_taken
from planner.model.campaign import Layout
from planner.model.trial import FeedNights, Prospect
from planner.recovery import joined
from planner.scoring.draws import UNRELATED, Draw, Measured, Setting, draw_strangers, draw_trial
from planner.scoring.placing import Placing, place_in
from planner.scoring.recovering import (
    REASONS,
    Curves,
    enough,
    judge,
    peaks_of_strangers,
    recover,
)

__all__ = [
    "COSTS",
    "Task",
    "Used",
    "hours_of",
    "nights_used",
    "observe",
    "run_strangers",
    "run_trials",
    "with_spectra",
]

Floats = NDArray[np.float64]
Nights = NDArray[np.bool_]
Used = tuple[tuple[Nights, ...], tuple[Nights, ...]]
"""For continuum and line, by telescope: which of the nights on offer are used."""


def nights_used(
    prospect: Prospect, layout: Layout, placing: Placing, usable: dict[str, NDArray[np.bool_]]
) -> Used:
    """Return which nights on offer a target that has the telescopes to itself would use.

    The time granted is spent from the first night on; a layout that outruns it ends early.
    """

    def taken(nights: FeedNights, cadence: float) -> NDArray[np.bool_]:
        mine: NDArray[np.bool_] = nights_taken(
            nights.night,
            usable[nights.telescope][nights.night],
            placing.first,
            placing.last,
            float(cadence),
        )
        mine[np.flatnonzero(mine)[nights.most_visits :]] = False
        return mine

    line = tuple(taken(n, layout.cadence_line_nights) for n in prospect.line)
    return with_spectra(
        prospect,
        tuple(
            taken(n, layout.cadence_continuum_nights)
            for n in prospect.continuum
            if n.in_spectra_of is None
        ),
        line,
    )


def with_spectra(
    prospect: Prospect, imaging: tuple[NDArray[np.bool_], ...], line: tuple[NDArray[np.bool_], ...]
) -> Used:
    """Add the continuum that comes with the line's spectra to the nights of images and spectra."""
    ridden = tuple(line[n.in_spectra_of] for n in prospect.continuum if n.in_spectra_of is not None)
    return (*imaging, *ridden), line


def observe(prospect: Prospect, draw: Draw, used: Used) -> Curves:
    """Return the light curves of the nights that were used, telescopes joined."""
    return Curves(
        *_stream(prospect.continuum, draw.continuum, used[0]),
        *_stream(prospect.line, draw.line, used[1]),
    )


def _stream(
    feeds: tuple[FeedNights, ...], measured: tuple[Measured, ...], used: tuple[Nights, ...]
) -> tuple[Floats, Floats, Floats]:
    """Return times, fluxes and errors of one stream, telescopes joined."""
    curves = [
        (feed.best_mjd[mine], flux[mine], error[mine])
        for feed, (flux, error), mine in zip(feeds, measured, used, strict=True)
    ]
    return joined(curves) if len(curves) > 1 else curves[0]


@dataclass(frozen=True, slots=True)
class Task:
    """Some trials of one target."""

    setting: Setting
    prospect: Prospect
    layouts: tuple[Layout, ...]
    used: tuple[Used, ...] | None
    """None: the target has the telescopes to itself. Else, for the one layout, the nights that a
    schedule gave it in each of the trials."""
    first: int
    last: int
    limits: tuple[float, ...]
    """For each layout: correlation that a claim must exceed besides what the rule asks."""


class _Case(NamedTuple):
    """One trial of one layout that can be scheduled."""

    layout: int
    trial: int
    draws: tuple[Draw, ...]
    used: Used
    span_d: float
    label: str


def _cases(
    task: Task, draws_of: Callable[[Setting, Prospect, int], tuple[Draw, ...]]
) -> Iterator[_Case]:
    """Yield every trial of every layout; layouts share a trial's draws."""
    placings = [place_in(task.prospect, layout) for layout in task.layouts]
    if not any(placing.first.size for placing in placings):
        return
    for trial in range(task.first, task.last):
        draws = draws_of(task.setting, task.prospect, trial)
        for i, (layout, placing) in enumerate(zip(task.layouts, placings, strict=True)):
            if placing.first.size == 0:
                continue
            span = float(placing.last[-1] - placing.first[0])
            if task.used is None:
                used = nights_used(task.prospect, layout, placing, draws[0].usable)
                yield _Case(i, trial, draws, used, span, str(layout))
            else:
                used = task.used[trial - task.first]
                yield _Case(i, trial, draws, used, span, f"executed {layout}")


def run_strangers(task: Task) -> dict[str, NDArray[np.float64]]:
    """Return the peak correlations of lines that know nothing of the continuum.

    Returns
    -------
    dict of one (layouts, trials, lines) float64 array
        ``r_unrelated``; NaN where none could be claimed.
    """
    shape = (len(task.layouts), task.last - task.first, UNRELATED)
    peaks = np.full(shape, np.nan)
    detrend = task.setting.simulation.detrend
    for case in _cases(task, draw_strangers):
        first, *others = case.draws
        curves = observe(task.prospect, first, case.used)
        if enough(curves):
            lines = [curves.f_line] + [
                _stream(task.prospect.line, draw.line, case.used[1])[1] for draw in others
            ]
            peaks[case.layout, case.trial - task.first] = peaks_of_strangers(
                task.prospect, curves, lines, case.span_d, detrend=detrend
            )
    return {"r_unrelated": peaks}


COSTS = ("epochs_line", "epochs_continuum", "hours", "hours_line", "hours_shutter")
"""What a layout costs, clock and shutter; epochs and hours of both streams."""

_LAGS = ("lag_true_d", "lag_d", "lag_lo_d", "lag_hi_d", "r_max")
_COUNTS = (*COSTS, "claim", "success", "reason")


def run_trials(task: Task) -> dict[str, NDArray[np.float64]]:
    """Run the trials of a task: observe, recover, judge.

    Returns
    -------
    dict of (layouts, trials) float64 arrays
        The columns of `TrialTable`.
    """
    shape = (len(task.layouts), task.last - task.first)
    table = {name: np.full(shape, np.nan) for name in _LAGS}
    table |= {name: np.zeros(shape) for name in _COUNTS}
    table["reason"][:] = REASONS.index("cannot be scheduled")
    for case in _cases(task, lambda *key: (draw_trial(*key),)):
        draw = case.draws[0]
        at = (case.layout, case.trial - task.first)
        limit = task.limits[case.layout]
        curves = observe(task.prospect, draw, case.used)
        found = recover(
            task.setting,
            task.prospect,
            curves,
            case.span_d,
            case.label,
            case.trial,
            limit,
            draw.lag_obs_d,
        )
        claim, success, reason = judge(found, draw.lag_obs_d, task.setting.success, limit)
        table["lag_true_d"][at] = draw.lag_obs_d
        table["claim"][at], table["success"][at], table["reason"][at] = claim, success, reason
        for name, value in hours_of(task.prospect, case.used).items():
            table[name][at] = value
        if found is not None:
            table["lag_d"][at] = found.lag_d
            table["lag_lo_d"][at], table["lag_hi_d"][at] = found.lag_lo_d, found.lag_hi_d
            table["r_max"][at] = found.r_max
    return table


def hours_of(prospect: Prospect, used: Used) -> dict[str, float]:
    """Return epochs, clock and shutter hours of the nights used, by the names of `COSTS`."""
    costs = dict.fromkeys(COSTS, 0.0)
    for kind, feeds, taken in (
        ("continuum", prospect.continuum, used[0]),
        ("line", prospect.line, used[1]),
    ):
        for feed, mine in zip(feeds, taken, strict=True):
            visits = float(np.count_nonzero(mine))
            hours = visits * (feed.visit_s + feed.standards_s) / 3600
            costs[f"epochs_{kind}"] += visits
            costs["hours"] += hours
            costs["hours_line"] += hours if kind == "line" else 0.0
            costs["hours_shutter"] += visits * feed.exposure_s / 3600
    return costs
