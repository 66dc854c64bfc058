"""One trial after another: draw, observe, recover, judge."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.seeds import stream
from planner.kernels.epochs import nights_taken
from planner.lightcurves import draw_pair, observed_continuum, observed_line
from planner.model.campaign import Campaign, Layout, Simulation, SuccessRule
from planner.model.observatory import WeatherClimate
from planner.model.trial import Prospect
from planner.recovery import (
    LagResult,
    is_claim,
    is_right,
    lag_grid,
    recover_lag,
    search_range,
)
from planner.scoring.placing import Placing, place
from planner.weather import clear_nights

__all__ = [
    "REASONS",
    "Curves",
    "Draw",
    "Setting",
    "draw_trial",
    "empty_table",
    "fill",
    "judge",
    "nights_used",
    "observe",
    "recover",
    "run_trials",
    "setting_of",
    "sky_of_trial",
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

SEARCH_SIGMAS = 2.5
"""Lags up to so many standard deviations of the prior above its median are looked for."""


@dataclass(frozen=True, slots=True)
class Setting:
    """What all targets of a campaign share; sent to the workers with every task."""

    seed: int
    first_night: int
    nights: int
    climates: tuple[tuple[str, WeatherClimate], ...]
    simulation: Simulation
    success: SuccessRule


def setting_of(campaign: Campaign) -> Setting:
    """Return what all trials of a campaign share."""
    return Setting(
        seed=campaign.seed,
        first_night=campaign.first_night,
        nights=campaign.last_night - campaign.first_night + 1,
        climates=tuple((s.name, s.weather) for s in campaign.sites),
        simulation=campaign.simulation,
        success=campaign.success,
    )


@dataclass(frozen=True, slots=True)
class Draw:
    """One trial's truth, and its fluxes on every night on offer, whatever the layout."""

    lag_obs_d: float
    clear: dict[str, NDArray[np.bool_]]
    """By site: usable nights, counted from the campaign's first."""
    flux_continuum: NDArray[np.float64]
    flux_line: NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Curves:
    """Both light curves of one trial of one layout; times in days of UTC MJD."""

    t_continuum: NDArray[np.float64]
    f_continuum: NDArray[np.float64]
    e_continuum: NDArray[np.float64]
    t_line: NDArray[np.float64]
    f_line: NDArray[np.float64]
    e_line: NDArray[np.float64]


def draw_trial(setting: Setting, prospect: Prospect, trial: int) -> Draw:
    """Draw everything random of one trial of one target, except the resampling of its errors.

    Lag, amplitude and timescale are log-normal about the forecast; the top-hat response's width
    is a uniform share of the lag. Each night on offer has its own flux and noise, whatever layout
    uses it.
    """
    forecast, simulation = prospect.forecast, setting.simulation
    name = forecast.name
    lag_z, amplitude_z, timescale_z = stream(setting.seed, "truth", name, trial).standard_normal(3)
    lag = forecast.lag_obs_d * 10 ** (forecast.lag_scatter_dex * lag_z)
    amplitude = forecast.amplitude_mag * 10 ** (forecast.amplitude_scatter_dex * amplitude_z)
    timescale = forecast.timescale_obs_d * 10 ** (forecast.timescale_scatter_dex * timescale_z)
    width = lag * stream(setting.seed, "response", name, trial).uniform(*simulation.response_width)
    continuum, line = prospect.continuum, prospect.line
    x, y = draw_pair(
        stream(setting.seed, "driver", name, trial),
        continuum.best_mjd - setting.first_night,
        line.best_mjd - setting.first_night,
        timescale,
        lag,
        width,
    )
    noise_c = stream(setting.seed, "noise continuum", name, trial).standard_normal(x.size)
    noise_l = stream(setting.seed, "noise line", name, trial).standard_normal(y.size)
    return Draw(
        lag_obs_d=lag,
        clear=sky_of_trial(setting, trial),
        flux_continuum=observed_continuum(
            x, amplitude, forecast.agn_fraction, continuum.flux_error, noise_c
        ),
        flux_line=observed_line(y, amplitude, simulation.responsivity, line.flux_error, noise_l),
    )


def sky_of_trial(setting: Setting, trial: int) -> dict[str, NDArray[np.bool_]]:
    """Return each site's usable nights in one trial: the same sky for every target."""
    nights = np.arange(setting.first_night, setting.first_night + setting.nights)
    return {
        site: clear_nights(
            climate,
            nights,
            stream(setting.seed, "weather", site, trial).uniform(size=(1, nights.size)),
        )[0]
        for site, climate in setting.climates
    }


def nights_used(
    prospect: Prospect, layout: Layout, placing: Placing, clear: dict[str, NDArray[np.bool_]]
) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """Return which nights on offer a target that has the telescopes to itself would use.

    Returns
    -------
    two bool arrays
        Over the nights on offer of the continuum and of the line.
    """
    continuum, line = (
        nights_taken(
            nights.night,
            clear[nights.site][nights.night],
            placing.first,
            placing.last,
            float(cadence),
        )
        for nights, cadence in (
            (prospect.continuum, layout.cadence_continuum_nights),
            (prospect.line, layout.cadence_line_nights),
        )
    )
    return continuum, line


def observe(
    prospect: Prospect,
    draw: Draw,
    taken_continuum: NDArray[np.bool_],
    taken_line: NDArray[np.bool_],
) -> Curves:
    """Return the light curves of the nights that were used."""
    c, l = taken_continuum, taken_line
    return Curves(
        prospect.continuum.best_mjd[c],
        draw.flux_continuum[c],
        prospect.continuum.flux_error[c],
        prospect.line.best_mjd[l],
        draw.flux_line[l],
        prospect.line.flux_error[l],
    )


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
    )


def judge(result: LagResult | None, lag_true_d: float, rule: SuccessRule) -> tuple[bool, bool, int]:
    """Return whether a result is a claim, whether it is a success, and the reason's index."""
    if result is None:
        return False, False, 2
    if not np.isfinite(result.lag_d):
        return False, False, 3
    if is_claim(result, rule):
        right = bool(is_right(result.lag_d, lag_true_d, rule.within))
        return True, right, 0 if right else 7
    if not result.r_max > rule.r_max_above:
        return False, False, 4
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
    placings = [place(layout, prospect.seasons, prospect.line) for layout in layouts]
    for trial in range(first, last):
        draw = draw_trial(setting, prospect, trial)
        for i, (layout, placing) in enumerate(zip(layouts, placings, strict=True)):
            at = (i, trial - first)
            table["lag_true_d"][at] = draw.lag_obs_d
            if placing.first.size == 0:
                table["reason"][at] = 1
                continue
            taken = nights_used(prospect, layout, placing, draw.clear)
            span = float(placing.last[-1] - placing.first[0])
            fill(table, at, setting, prospect, draw, taken, span, str(layout), trial)
    return table


_LAGS = ("lag_true_d", "lag_d", "lag_lo_d", "lag_hi_d", "r_max")
_COUNTS = ("epochs_line", "epochs_continuum", "claim", "success", "reason")


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
    taken: tuple[NDArray[np.bool_], NDArray[np.bool_]],
    span_d: float,
    label: str,
    trial: int,
) -> None:
    """Observe, recover and judge one trial, and write it into the table."""
    curves = observe(prospect, draw, *taken)
    result = recover(setting, prospect, curves, span_d, label, trial)
    claim, success, reason = judge(result, draw.lag_obs_d, setting.success)
    table["epochs_continuum"][at] = curves.t_continuum.size
    table["epochs_line"][at] = curves.t_line.size
    table["claim"][at], table["success"][at], table["reason"][at] = claim, success, reason
    if result is not None:
        table["lag_d"][at] = result.lag_d
        table["lag_lo_d"][at], table["lag_hi_d"][at] = result.lag_lo_d, result.lag_hi_d
        table["r_max"][at] = result.r_max
