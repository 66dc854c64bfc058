"""The lag of one simulated campaign, by the methods an observer would use."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.base.seeds import stream
from planner.model.campaign import SuccessRule
from planner.model.trial import Prospect
from planner.recovery import (
    Belief,
    LagPosterior,
    LagResult,
    Response,
    is_right,
    lag_grid,
    lag_posterior,
    passes_cuts,
    recover_lag,
    search_range,
)
from planner.recovery.lag import MIN_SHARE, peak_correlations
from planner.recovery.primary import median_step
from planner.scoring.draws import Setting

__all__ = [
    "CHANCE",
    "REASONS",
    "Curves",
    "Found",
    "by_correlation",
    "by_likelihood",
    "enough",
    "judge",
    "peaks_of_strangers",
    "recover",
    "search_of",
    "settled",
]

Floats = NDArray[np.float64]

REASONS = (
    "",
    "cannot be scheduled",
    "too few epochs",
    "no peak inside the search range",
    "weak correlation",
    "error too large",
    "consistent with zero lag",
    "claimed lag is wrong",
    "several peaks",
    "methods disagree",
    "could be chance",
)
"""Why a trial is no success, by the index kept in `TrialTable.reason`; the first means success."""

CHANCE = REASONS.index("could be chance")

FEWEST_EPOCHS = 5
"""Below this many epochs in a stream no lag is looked for (common practice, no source)."""

WIDTHS = 3
"""Widths of the response that the likelihood averages over."""

SEARCH_SIGMAS = 2.5
"""Lags up to so many standard deviations of the prior above its median are looked for."""

SURE = 3.29
"""Standard errors by which a cut must be passed or failed before resampling ends: 99.9 %."""

# Covariances of the sample quantiles at 16, 50 and 84 % of a Gaussian, times the sample's size over
# its variance: p (1 - q) / (density at p * density at q), for p <= q; textbook statistics.
QUANTILES = np.array([[2.280, 0.822, 0.430], [0.822, 1.571, 0.822], [0.430, 0.822, 2.280]])


@dataclass(frozen=True, slots=True)
class Curves:
    """Both light curves of one trial of one layout; times in days of UTC MJD."""

    t_continuum: Floats
    f_continuum: Floats
    e_continuum: Floats
    t_line: Floats
    f_line: Floats
    e_line: Floats

    def columns(self) -> tuple[Floats, Floats, Floats, Floats, Floats, Floats]:
        """Return the six arrays in the order in which recovery takes them."""
        return (
            self.t_continuum,
            self.f_continuum,
            self.e_continuum,
            self.t_line,
            self.f_line,
            self.e_line,
        )


class Found(NamedTuple):
    """A recovered lag, whatever the method; NaN where there is none."""

    lag_d: float
    lag_lo_d: float
    lag_hi_d: float
    r_max: float
    """Infinite for a method without correlation."""
    in_peak: float
    log_odds: float = np.inf
    """Likelihood: ln of the odds of an echo against an unrelated line."""
    agrees: bool = True
    """False: the 68 % interval of the other method does not overlap this one's."""


def recover(
    setting: Setting,
    prospect: Prospect,
    curves: Curves,
    span_d: float,
    label: str,
    trial: int,
    limit: float,
    lag_true_d: float | None = None,
) -> Found | None:
    """Recover the lag of one trial; None where there are too few epochs to look for one.

    Parameters
    ----------
    span_d : float
        First planned night to last; with the lag's prior it sets the search range.
    label : str
        Names the way of observing in the random stream of the resampling.
    limit : float
        Correlation that a claim must exceed besides what the rule asks.
    lag_true_d : float or None
        Lets a correlation's resampling end early only when it is sure, too, whether a claim is
        right.

    Notes
    -----
    Resampling ends as soon as the verdict is beyond reasonable doubt, see `settled`: lag and
    interval may come from fewer resamples than the campaign file asks for.
    """
    if not enough(curves):
        return None
    if setting.simulation.method == "likelihood":
        found = _of_posterior(by_likelihood(setting, prospect, curves, span_d))
    else:
        decided = partial(
            settled,
            resamples=setting.simulation.resamples,
            rule=setting.success,
            lag_true_d=lag_true_d,
        )
        found = _of_result(
            by_correlation(setting, prospect, curves, span_d, label, trial, limit, decided)
        )
    if setting.success.agree and _passes(found, setting.success):
        if setting.simulation.method == "likelihood":
            other = _of_result(by_correlation(setting, prospect, curves, span_d, label, trial))
        else:
            other = _of_posterior(by_likelihood(setting, prospect, curves, span_d))
        overlap = other.lag_lo_d <= found.lag_hi_d and found.lag_lo_d <= other.lag_hi_d
        found = found._replace(agrees=bool(overlap))
    return found


def enough(curves: Curves) -> bool:
    """Say whether there are epochs enough to look for a lag."""
    return min(curves.t_continuum.size, curves.t_line.size) >= FEWEST_EPOCHS


def _of_result(result: LagResult) -> Found:
    return Found(result.lag_d, result.lag_lo_d, result.lag_hi_d, result.r_max, result.in_peak)


def _of_posterior(result: LagPosterior) -> Found:
    if result.at_edge:
        return Found(np.nan, np.nan, np.nan, np.inf, 0.0, result.log_odds)
    lag, lo, hi = result.lag_d, result.lag_lo_d, result.lag_hi_d
    return Found(lag, lo, hi, np.inf, result.primary_share, result.log_odds)


def search_of(prospect: Prospect, span_d: float) -> tuple[float, float]:
    """Return the lowest and highest lag to look for in a campaign of that span, in days."""
    forecast = prospect.forecast
    longest = forecast.lag_obs_d * 10 ** (SEARCH_SIGMAS * forecast.lag_scatter_dex)
    return search_range(span_d, longest, forecast.timescale_obs_d)


def by_correlation(
    setting: Setting,
    prospect: Prospect,
    curves: Curves,
    span_d: float,
    label: str,
    trial: int,
    limit: float = -np.inf,
    decided: Callable[[LagResult], bool] | None = None,
) -> LagResult:
    """Recover the lag by interpolated cross-correlation; arguments as for `recover`.

    All resamples are drawn unless `decided` ends it, see `recover_lag`.
    """
    sampling = median_step(curves.t_continuum)
    return recover_lag(
        *curves.columns(),
        lag_grid(*search_of(prospect, span_d), sampling),
        setting.simulation.resamples,
        stream(setting.seed, "resampling", prospect.forecast.name, label, trial),
        r_max_above=max(setting.success.r_max_above, limit),
        detrend=setting.simulation.detrend,
        decided=decided,
    )


def settled(
    result: LagResult, resamples: int, rule: SuccessRule, lag_true_d: float | None = None
) -> bool:
    """Say whether the resamples drawn so far leave no reasonable doubt about a trial's verdict.

    Each cut must be passed or failed by `SURE` standard errors of what all resamples would still
    change. Those of quantiles are a Gaussian's, with the scatter of the lags in the primary peak
    or half their 68 % interval, whichever is larger; those of shares and of the heights of peaks
    are a count's. All shrink by the square root of the share of resamples not yet drawn.

    With few resamples neighbouring peaks may still merge, so that the doubt is a little larger
    than stated: of 3227 resampled trials of the sample campaign, 0.5 % changed their claim, and
    54 of 100 resamples were drawn on average.

    Parameters
    ----------
    resamples : int
        All that would be drawn.
    lag_true_d : float or None
        None: whether a claim is right does not matter.
    """
    doubt = SURE * np.sqrt(1.0 - result.drawn / resamples)
    unsure = doubt * np.sqrt(MIN_SHARE * (1.0 - MIN_SHARE) / result.drawn)
    if result.share < MIN_SHARE - unsure:
        return True
    if result.reason or result.share < MIN_SHARE + unsure:
        return False
    found, least = result.centroids_d.size, rule.in_peak_above
    largest = max([result.in_peak, *(share for _, share in result.aliases[:1])])
    unsure = doubt * np.sqrt(max(largest * (1.0 - largest), 1.0 / found) / found)
    if largest < least - unsure:
        return True
    inside = result.in_peak * found
    alone = 1.0 - result.rival > doubt * np.sqrt((1.0 + result.rival) / inside)
    # Where a claim takes more than half of the lags, only the peak that has most can give one.
    if result.in_peak < largest or (least < 0.5 and not alone):
        return False
    below, above = rule.error_below, rule.sigma_above
    cuts = np.array([[0.0, 1.0, 0.0], [0.5, below, -0.5], [above, 1.0 - above, 0.0]])
    cuts = cuts[np.isfinite(cuts).all(axis=1)]  # an infinite cut is none
    margins = cuts @ (result.lag_lo_d, result.lag_d, result.lag_hi_d)
    sigma = max(0.5 * (result.lag_hi_d - result.lag_lo_d), result.scatter_d)
    error = doubt * sigma / np.sqrt(inside)
    errors = error * np.sqrt(((cuts @ QUANTILES) * cuts).sum(axis=1))
    if (margins < -errors).any():
        return True
    # The interval of a claim that another method must confirm is wanted in full.
    if rule.agree or not (alone and largest > least + unsure and (margins > errors).all()):
        return False
    if lag_true_d is None:
        return True
    off = abs(abs(result.lag_d - lag_true_d) - rule.within * lag_true_d)
    return bool(off > error * np.sqrt(QUANTILES[1, 1]))


def peaks_of_strangers(
    prospect: Prospect, curves: Curves, strangers: Sequence[Floats], span_d: float, *, detrend: bool
) -> list[float]:
    """Return the peak correlation of each unrelated line with the continuum.

    Parameters
    ----------
    strangers : sequence of (m,) arrays
        Fluxes at the line's epochs.
    """
    sampling = median_step(curves.t_continuum)
    lags = lag_grid(*search_of(prospect, span_d), sampling)
    return peak_correlations(*curves.columns()[:4], strangers, curves.e_line, lags, detrend=detrend)


def by_likelihood(
    setting: Setting, prospect: Prospect, curves: Curves, span_d: float
) -> LagPosterior:
    """Recover the lag by the joint likelihood of both curves.

    All lags of the search are held equally likely beforehand; of the variability's timescale the
    forecast and its scatter are known, of the response's width the range, amplitude and
    responsivity only from the curves.
    """
    forecast = prospect.forecast
    least, most = setting.simulation.response_width
    middles = least + (most - least) * (np.arange(WIDTHS) + 0.5) / WIDTHS
    belief = Belief(
        tau_d=forecast.timescale_obs_d,
        tau_dex=max(forecast.timescale_scatter_dex, 0.1),
        responses=tuple(Response("top_hat", float(width)) for width in middles),
    )
    return lag_posterior(*curves.columns(), *search_of(prospect, span_d), belief)


def _passes(found: Found, rule: SuccessRule) -> bool:
    return bool(passes_cuts(*found[:5], rule))


def judge(
    found: Found | None, lag_true_d: float, rule: SuccessRule, limit: float = -np.inf
) -> tuple[bool, bool, int]:
    """Return whether a lag is a claim, whether it is a success, and the reason's index.

    `limit` is a correlation that a claim must exceed besides what the rule asks.
    """
    if found is None:
        return False, False, 2
    if found.r_max <= rule.r_max_above:
        return False, False, 4
    if found.r_max <= limit:
        return False, False, CHANCE
    if not np.isfinite(found.lag_d):
        return False, False, 3
    if _passes(found, rule):
        if found.log_odds <= -np.log(rule.false_alarm_below):
            return False, False, CHANCE
        if not found.agrees:
            return False, False, 9
        right = bool(is_right(found.lag_d, lag_true_d, rule.within))
        return True, right, 0 if right else 7
    if found.in_peak <= rule.in_peak_above:
        return False, False, 8
    if found.lag_d <= rule.sigma_above * (found.lag_d - found.lag_lo_d):
        return False, False, 6
    return False, False, 5
