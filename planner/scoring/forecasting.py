"""Layouts judged at once, without recovery of any lag: the information in their epochs."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.base.seeds import stream
from planner.base.workers import each
from planner.lightcurves import FRACTION_PER_MAG
from planner.model.campaign import Layout
from planner.model.trial import Prospect
from planner.recovery import (
    Ambiguity,
    Design,
    Response,
    ambiguity,
    expected_recovery,
    fisher_forecast,
    make_design,
)
from planner.scoring.draws import Setting, sky_of_trial, truth_of
from planner.scoring.placing import place_in
from planner.scoring.recovering import FEWEST_EPOCHS, search_of
from planner.scoring.trials import nights_used

__all__ = ["LayoutForecast", "ambiguity_of", "forecast_layout", "forecast_layouts"]

Floats = NDArray[np.float64]

DRAWS = 8
"""Draws of truth and weather for each layout."""


@dataclass(frozen=True, slots=True)
class LayoutForecast:
    """What the information in a layout's epochs promises."""

    target: str
    layout: Layout
    success: float
    """Chance that a likelihood recovery that knows the walk and the response is narrow enough and
    right; trials fall short of it by what recovery must find out by itself."""
    error: float
    """Median over draws of the least fractional error of the lag (Fisher information)."""


def forecast_layout(
    setting: Setting, prospect: Prospect, layout: Layout, draws: int = DRAWS
) -> LayoutForecast:
    """Return the forecast of one layout; 0 and infinite where it cannot be scheduled."""
    placing = place_in(prospect, layout)
    name = prospect.forecast.name
    if placing.first.size == 0:
        return LayoutForecast(name, layout, 0.0, np.inf)
    designs = [design_of(setting, prospect, layout, trial) for trial in range(draws)]
    usable = [d for d in designs if d.t1_d.size >= FEWEST_EPOCHS and d.t2_d.size >= FEWEST_EPOCHS]
    if not usable:
        return LayoutForecast(name, layout, 0.0, np.inf)
    span = float(placing.last[-1] - placing.first[0])
    expected = expected_recovery(
        usable,
        *search_of(prospect, span),
        setting.success.within,
        setting.success.error_below,
        stream(setting.seed, "forecast", name, str(layout)),
    )
    errors = [fisher_forecast(d).error_d / d.lag_d for d in usable]
    return LayoutForecast(
        name, layout, expected.success * len(usable) / draws, float(np.median(errors))
    )


def _forecast_one(task: tuple[Setting, Prospect, Layout]) -> LayoutForecast:
    return forecast_layout(*task)


def forecast_layouts(
    setting: Setting,
    prospects: Sequence[Prospect],
    layouts: Sequence[Layout],
    *,
    workers: int,
    progress: Callable[[str, int, int], None],
) -> tuple[LayoutForecast, ...]:
    """Return every layout's information forecast, by target, the most promising first."""
    tasks = [(setting, p, layout) for p in prospects for layout in layouts]
    found: dict[int, LayoutForecast] = {}
    for index, promise in each(_forecast_one, tasks, workers):
        found[index] = promise
        progress("forecast", len(found), len(tasks))
    order = {p.forecast.name: i for i, p in enumerate(prospects)}
    return tuple(
        sorted(
            (found[i] for i in range(len(tasks))),
            key=lambda f: (order[f.target], -f.success, f.error),
        )
    )


def design_of(setting: Setting, prospect: Prospect, layout: Layout, trial: int) -> Design:
    """Return epochs, errors and truth of one trial, as the information forecast takes them."""
    truth = truth_of(setting, prospect, trial)
    placing = place_in(prospect, layout)
    used = nights_used(prospect, layout, placing, sky_of_trial(setting, trial))
    (t1, e1), (t2, e2) = (
        [
            np.concatenate([getattr(n, name)[mine] for n, mine in zip(feeds, taken, strict=True)])
            for name in ("best_mjd", "flux_error")
        ]
        for feeds, taken in ((prospect.continuum, used[0]), (prospect.line, used[1]))
    )
    which = np.concatenate([np.full(np.count_nonzero(mine), i) for i, mine in enumerate(used[0])])
    fraction = prospect.forecast.agn_fraction
    return make_design(
        t1,
        e1,
        t2,
        e2,
        lag_d=truth.lag_d,
        sigma=fraction * FRACTION_PER_MAG * truth.amplitude_mag,
        tau_d=truth.timescale_d,
        scale=setting.simulation.responsivity / fraction,
        response=Response("top_hat", truth.width_d / truth.lag_d),
        telescope1=which,
    )


def ambiguity_of(setting: Setting, prospect: Prospect, layout: Layout) -> Ambiguity:
    """Return how well one trial's epochs tell the forecast's lag from every other lag.

    Truth is the forecast's median, weather that of the first trial.
    """
    forecast = prospect.forecast
    median = replace(
        forecast, lag_scatter_dex=0.0, amplitude_scatter_dex=0.0, timescale_scatter_dex=0.0
    )
    case = replace(prospect, forecast=median)
    placing = place_in(prospect, layout)
    span = float(placing.last[-1] - placing.first[0])
    lags = np.linspace(*search_of(prospect, span), 241)
    return ambiguity(design_of(setting, case, layout, 0), lags)
