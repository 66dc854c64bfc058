"""Layouts judged at once, without recovery of any lag: the information in their epochs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.base.seeds import stream
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
from planner.recovery.information import with_normal_points
from planner.scoring.draws import Setting, Truth, sky_of_trial, truth_of
from planner.scoring.placing import place_in
from planner.scoring.recovering import FEWEST_EPOCHS, search_of
from planner.scoring.trials import COSTS, Used, hours_of, nights_used

__all__ = [
    "LayoutForecast",
    "ambiguity_of",
    "design_of",
    "forecast_layout",
    "forecast_target",
]

Floats = NDArray[np.float64]

DRAWS = 8
"""Draws of truth and weather for each layout."""


BIN = 1.0 / 16.0
"""Epochs are averaged over this share of the lag, the timescale or the span: variability on so
short a time is smeared by the response and tells little of the lag."""

CURVE = 161
"""Lags at which an ambiguity curve is worked out."""


@dataclass(frozen=True, slots=True)
class LayoutForecast:
    """What the information in a layout's epochs promises."""

    target: str
    layout: Layout
    success: float
    """Chance that a likelihood recovery that knows the walk and the response is narrow enough and
    right; trials fall short of it by what recovery must find out by itself."""
    error: float
    """Median over draws of the least fractional error of the lag (Fisher information), all else
    known but the offsets. Where it is below one half, not knowing adds 4 % of it at most."""
    epochs_line: float
    """Mean over draws, as what follows; 0 where the layout cannot be scheduled."""
    epochs_continuum: float
    hours: float
    """Clock hours of both streams."""
    hours_line: float
    hours_shutter: float
    """Exposures alone, both streams."""


class _Draw(NamedTuple):
    """What one trial draws that no layout has a part in."""

    truth: Truth
    usable: dict[str, NDArray[np.bool_]]


def _draw(setting: Setting, prospect: Prospect, trial: int) -> _Draw:
    return _Draw(truth_of(setting, prospect, trial), sky_of_trial(setting, trial))


def forecast_layout(
    setting: Setting, prospect: Prospect, layout: Layout, draws: int = DRAWS
) -> LayoutForecast:
    """Return the forecast of one layout; 0 and infinite where it cannot be scheduled."""
    return forecast_target(setting, prospect, [layout], draws)[0]


def forecast_target(
    setting: Setting, prospect: Prospect, layouts: Sequence[Layout], draws: int = DRAWS
) -> list[LayoutForecast]:
    """Return the forecasts of a target's layouts, in their order.

    Truth and weather are drawn once for all; a layout's forecast does not depend on the others.
    """
    drawn = [_draw(setting, prospect, trial) for trial in range(draws)]
    return [_forecast(setting, prospect, layout, drawn) for layout in layouts]


def _forecast(
    setting: Setting, prospect: Prospect, layout: Layout, drawn: Sequence[_Draw]
) -> LayoutForecast:
    placing = place_in(prospect, layout)
    target = prospect.forecast.name
    if placing.first.size == 0:
        return LayoutForecast(target, layout, 0.0, np.inf, **dict.fromkeys(COSTS, 0.0))
    taken = [nights_used(prospect, layout, placing, draw.usable) for draw in drawn]
    spent = [hours_of(prospect, used) for used in taken]
    costs = {name: float(np.mean([one[name] for one in spent])) for name in COSTS}
    designs = [
        _design(setting, prospect, draw.truth, used)
        for draw, used in zip(drawn, taken, strict=True)
    ]
    usable = [
        with_normal_points(d, BIN)
        for d in designs
        if min(d.t1_d.size, d.t2_d.size) >= FEWEST_EPOCHS
    ]
    if not usable:
        return LayoutForecast(target, layout, 0.0, np.inf, **costs)
    span = float(placing.last[-1] - placing.first[0])
    expected = expected_recovery(
        usable,
        *search_of(prospect, span),
        setting.success.within,
        setting.success.error_below,
        stream(setting.seed, "forecast", target, str(layout)),
    )
    errors = [fisher_forecast(d, 0.0, 0.0, 0.0).error_d / d.lag_d for d in usable]
    success = expected.success * len(usable) / len(drawn)
    return LayoutForecast(target, layout, success, float(np.median(errors)), **costs)


def design_of(setting: Setting, prospect: Prospect, layout: Layout, trial: int) -> Design:
    """Return epochs, errors and truth of one trial, as the information forecast takes them."""
    draw = _draw(setting, prospect, trial)
    used = nights_used(prospect, layout, place_in(prospect, layout), draw.usable)
    return _design(setting, prospect, draw.truth, used)


def _design(setting: Setting, prospect: Prospect, truth: Truth, used: Used) -> Design:
    """Return the design of one draw of truth and nights."""
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
    lags = np.linspace(*search_of(prospect, span), CURVE)
    return ambiguity(design_of(setting, case, layout, 0), lags)
