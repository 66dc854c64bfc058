"""One trial after another: draw, observe, recover, judge."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from planner.kernels.epochs import nights_taken
from planner.model.campaign import Layout
from planner.model.trial import FeedNights, Prospect
from planner.recovery import joined
from planner.scoring.draws import UNRELATED, Draw, Setting, draw_trial
from planner.scoring.placing import Placing, place_in
from planner.scoring.recovering import Curves, judge, peaks_of_strangers, recover

__all__ = [
    "Used",
    "empty_table",
    "fill",
    "nights_used",
    "observe",
    "run_trials",
    "with_spectra",
]

Floats = NDArray[np.float64]
Used = tuple[tuple[NDArray[np.bool_], ...], tuple[NDArray[np.bool_], ...]]
"""For continuum and line, by telescope: which of the nights on offer are used."""


def nights_used(
    prospect: Prospect, layout: Layout, placing: Placing, usable: dict[str, NDArray[np.bool_]]
) -> Used:
    """Return which nights on offer a target that has the telescopes to itself would use."""

    def taken(nights: FeedNights, cadence: float) -> NDArray[np.bool_]:
        mine: NDArray[np.bool_] = nights_taken(
            nights.night,
            usable[nights.telescope][nights.night],
            placing.first,
            placing.last,
            float(cadence),
        )
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
    streams = []
    for feeds, measured, taken in (
        (prospect.continuum, draw.continuum, used[0]),
        (prospect.line, draw.line, used[1]),
    ):
        streams.append(
            joined(
                [
                    (feed.best_mjd[mine], flux[mine], error[mine])
                    for feed, (flux, error), mine in zip(feeds, measured, taken, strict=True)
                ]
            )
        )
    return Curves(*streams[0], *streams[1])


def run_trials(
    setting: Setting, prospect: Prospect, layouts: tuple[Layout, ...], first: int, last: int
) -> dict[str, NDArray[np.float64]]:
    """Run trials `first` to `last` - 1 of every layout of one target.

    Returns
    -------
    dict of (layouts, trials) float64 arrays
        The columns of `TrialTable`.
    """
    table = empty_table(len(layouts), last - first)
    placings = [place_in(prospect, layout) for layout in layouts]
    for trial in range(first, last):
        draw = draw_trial(setting, prospect, trial)
        for i, (layout, placing) in enumerate(zip(layouts, placings, strict=True)):
            at = (i, trial - first)
            table["lag_true_d"][at] = draw.lag_obs_d
            if placing.first.size == 0:
                table["reason"][at] = 1
                continue
            used = nights_used(prospect, layout, placing, draw.usable)
            span = float(placing.last[-1] - placing.first[0])
            fill(table, at, setting, prospect, draw, used, span, str(layout), trial)
    return table


_LAGS = ("lag_true_d", "lag_d", "lag_lo_d", "lag_hi_d", "r_max")
_COUNTS = (
    "epochs_line", "epochs_continuum", "hours", "hours_line", "hours_shutter", "claim", "success",
    "reason",
)  # fmt: skip


def empty_table(layouts: int, trials: int) -> dict[str, NDArray[np.float64]]:
    """Return the columns of `TrialTable`, still without outcomes."""
    table = {name: np.full((layouts, trials), np.nan) for name in _LAGS}
    table["r_unrelated"] = np.full((layouts, trials, UNRELATED), np.nan)
    return table | {name: np.zeros((layouts, trials)) for name in _COUNTS}


def fill(
    table: dict[str, NDArray[np.float64]],
    at: tuple[int, int],
    setting: Setting,
    prospect: Prospect,
    draw: Draw,
    used: Used,
    span_d: float,
    label: str,
    trial: int,
) -> None:
    """Observe, recover and judge one trial, and write it into the table."""
    curves = observe(prospect, draw, used)
    found = recover(setting, prospect, curves, span_d, label, trial)
    claim, success, reason = judge(found, draw.lag_obs_d, setting.success)
    table["epochs_continuum"][at] = curves.t_continuum.size
    table["epochs_line"][at] = curves.t_line.size
    for kind, feeds, taken in (("", prospect.continuum, used[0]), ("line", prospect.line, used[1])):
        for feed, mine in zip(feeds, taken, strict=True):
            visits = np.count_nonzero(mine)
            hours = visits * (feed.visit_s + feed.standards_s) / 3600
            table["hours"][at] += hours
            table["hours_line"][at] += hours if kind == "line" else 0.0
            table["hours_shutter"][at] += visits * feed.exposure_s / 3600
    table["claim"][at], table["success"][at], table["reason"][at] = claim, success, reason
    if found is not None and setting.simulation.method == "correlation":
        strangers = [
            observe(prospect, replace(draw, line=line), used).f_line for line in draw.unrelated
        ]
        table["r_unrelated"][at][: len(strangers)] = peaks_of_strangers(
            prospect, curves, strangers, span_d, detrend=setting.simulation.detrend
        )
    if found is not None:
        table["lag_d"][at] = found.lag_d
        table["lag_lo_d"][at], table["lag_hi_d"][at] = found.lag_lo_d, found.lag_hi_d
        table["r_max"][at] = found.r_max
