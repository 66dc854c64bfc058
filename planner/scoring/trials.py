"""One trial after another: draw, observe, recover, judge."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.seeds import stream
from planner.kernels.epochs import nights_taken
from planner.model.campaign import Layout, SuccessRule
from planner.model.trial import FeedNights, Prospect
from planner.recovery import (
    LagResult,
    is_claim,
    is_right,
    joined,
    lag_grid,
    recover_lag,
    search_range,
)
from planner.scoring.draws import Draw, Setting, draw_trial
from planner.scoring.placing import Placing, place_in

__all__ = [
    "REASONS",
    "Curves",
    "Used",
    "empty_table",
    "fill",
    "judge",
    "nights_used",
    "observe",
    "recover",
    "run_trials",
    "with_spectra",
]

REASONS = (
    "",
    "cannot be scheduled",
    "too few epochs",
    "no peak inside the search range",
    "weak correlation",
    "error too large",
    "consistent with zero lag",
    "claimed lag is wrong",
)
"""Why a trial is no success, by the index kept in `TrialTable.reason`; the first means success."""

FEWEST_EPOCHS = 5
"""Below this many epochs in a stream no lag is looked for (common practice, no source)."""

Floats = NDArray[np.float64]
Used = tuple[tuple[NDArray[np.bool_], ...], tuple[NDArray[np.bool_], ...]]
"""For continuum and line, by telescope: which of the nights on offer are used."""

SEARCH_SIGMAS = 2.5
"""Lags up to so many standard deviations of the prior above its median are looked for."""


@dataclass(frozen=True, slots=True)
class Curves:
    """Both light curves of one trial of one layout; times in days of UTC MJD."""

    t_continuum: Floats
    f_continuum: Floats
    e_continuum: Floats
    t_line: Floats
    f_line: Floats
    e_line: Floats


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


def recover(
    setting: Setting, prospect: Prospect, curves: Curves, span_d: float, label: str, trial: int
) -> LagResult | None:
    """Recover the lag of one trial; None where there are too few epochs to look for one.

    Parameters
    ----------
    span_d : float
        First planned night to last; with the lag's prior it sets the search range.
    label : str
        Names the way of observing in the random stream of the resampling.
    """
    if min(curves.t_continuum.size, curves.t_line.size) < FEWEST_EPOCHS:
        return None
    forecast = prospect.forecast
    longest = forecast.lag_obs_d * 10 ** (SEARCH_SIGMAS * forecast.lag_scatter_dex)
    sampling = float(np.median(np.diff(curves.t_continuum)))
    lags = lag_grid(*search_range(span_d, longest, forecast.timescale_obs_d), sampling)
    return recover_lag(
        curves.t_continuum,
        curves.f_continuum,
        curves.e_continuum,
        curves.t_line,
        curves.f_line,
        curves.e_line,
        lags,
        setting.simulation.resamples,
        stream(setting.seed, "resampling", forecast.name, label, trial),
        r_max_above=setting.success.r_max_above,
    )


def judge(result: LagResult | None, lag_true_d: float, rule: SuccessRule) -> tuple[bool, bool, int]:
    """Return whether a result is a claim, whether it is a success, and the reason's index."""
    if result is None:
        return False, False, 2
    if result.r_max <= rule.r_max_above:
        return False, False, 4
    if not np.isfinite(result.lag_d):
        return False, False, 3
    if is_claim(result, rule):
        right = bool(is_right(result.lag_d, lag_true_d, rule.within))
        return True, right, 0 if right else 7
    half_width = 0.5 * (result.lag_hi_d - result.lag_lo_d)
    if result.lag_d <= rule.sigma_above * (result.lag_d - result.lag_lo_d):
        return False, False, 6
    return False, False, 5 if half_width >= rule.error_below * result.lag_d else 3


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
    result = recover(setting, prospect, curves, span_d, label, trial)
    claim, success, reason = judge(result, draw.lag_obs_d, setting.success)
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
    if result is not None:
        table["lag_d"][at] = result.lag_d
        table["lag_lo_d"][at], table["lag_hi_d"][at] = result.lag_lo_d, result.lag_hi_d
        table["r_max"][at] = result.r_max
