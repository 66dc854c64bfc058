"""An observer's own two light curves, recovered by the methods that judge plans."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.seeds import stream
from planner.lightcurves import draw_pair
from planner.model.campaign import SuccessRule
from planner.recovery import (
    Belief,
    DiscreteLag,
    LagPosterior,
    LagResult,
    discrete_correlation,
    discrete_lag,
    is_claim,
    lag_grid,
    lag_posterior,
    make_pair,
    passes_cuts,
    peak_correlation,
    recover_lag,
    search_range,
    walk_nodes,
)
from planner.scoring.recovering import Curves

__all__ = ["STRANGERS", "OwnRecovery", "recover_own"]

Floats = NDArray[np.float64]

LAGS, RESAMPLES = 961, 1000
"""More than in trials, for these curves are recovered but once."""

STRANGERS = 400
"""Unrelated lines simulated on the same epochs."""

USUAL_TIMESCALE, SCATTER_DEX = 0.3, 0.6
"""Prior of the damping timescale over the continuum's baseline: wide; fits of short baselines come
out near 20 to 30 % of them whatever the truth (Kozlowski 2017)."""


@dataclass(frozen=True, slots=True)
class OwnRecovery:
    """What each method makes of two light curves; lags in observed-frame days."""

    correlation: LagResult
    likelihood: LagPosterior
    discrete: DiscreteLag
    chance: float
    """Share of unrelated lines, simulated on the same epochs, whose correlation peaks at least as
    high at a positive lag; NaN where there is no peak."""
    correlation_claim: bool
    likelihood_claim: bool
    """Whether the lag passes the quality cuts."""
    agree: bool
    """Whether the 68 % intervals of correlation and likelihood overlap."""


def recover_own(curves: Curves, rule: SuccessRule, seed: int, *, detrend: bool) -> OwnRecovery:
    """Recover a lag of which nothing is known beforehand.

    Every lag is searched that leaves a third of the data overlapping. Unrelated lines are damped
    random walks with timescales from the continuum's own posterior and the line's own scatter and
    errors.

    Parameters
    ----------
    curves : Curves
        Any order; unusable epochs are left out.
    rule : SuccessRule
        Its quality cuts.
    seed : int
    detrend : bool
        Take a straight line off both curves before correlating.
    """
    times = np.concatenate([curves.t_continuum, curves.t_line])
    span = float(np.ptp(times)) if times.size else 0.0
    if not span > 0.0:
        span = 1.0
    lo, hi = search_range(span, span, 2 * span)
    lags = lag_grid(lo, hi, 1.0, LAGS)
    result = recover_lag(
        *curves.columns(), lags, RESAMPLES, stream(seed, "own resampling"), detrend=detrend
    )
    belief = Belief(tau_d=USUAL_TIMESCALE * span, tau_dex=SCATTER_DEX)
    posterior = lag_posterior(*curves.columns(), lo, hi, belief)
    discrete = discrete_lag(discrete_correlation(*curves.columns(), lo, hi))
    chance = np.nan
    if np.isfinite(result.lag_d) and not posterior.reason:
        peaks = _strangers(curves, belief, lags, result.centroid_d, seed, detrend=detrend)
        chance = float(np.mean(np.nan_to_num(peaks, nan=-1.0) >= result.r_max))
    overlap = posterior.lag_lo_d <= result.lag_hi_d and result.lag_lo_d <= posterior.lag_hi_d
    likely = passes_cuts(
        posterior.lag_d,
        posterior.lag_lo_d,
        posterior.lag_hi_d,
        np.inf,
        posterior.primary_share,
        rule,
    )
    odds = posterior.log_odds > -np.log(rule.false_alarm_below)
    together = bool(overlap) or not rule.agree
    return OwnRecovery(
        correlation=result,
        likelihood=posterior,
        discrete=discrete,
        chance=chance,
        correlation_claim=is_claim(result, rule) and chance < rule.false_alarm_below and together,
        likelihood_claim=bool(likely) and bool(odds) and together and not posterior.at_edge,
        agree=bool(overlap),
    )


def _strangers(
    curves: Curves, belief: Belief, lags: Floats, lag_d: float, seed: int, *, detrend: bool
) -> list[float]:
    """Return the peak correlation of each of many unrelated lines with the continuum.

    They are as smooth as a line of that lag, and scatter as the line does: sharper or noisier ones
    would correlate less, and make too much of the line's own peak.
    """
    pair = make_pair(*curves.columns())
    sigma = float(pair.y1.std())
    nodes = walk_nodes(pair, sigma, belief.sigma_dex, belief.tau_d, belief.tau_dex)
    weights = np.array([weight for weight, _ in nodes])
    rms = np.sqrt(max(float(np.var(pair.y2) - np.mean(pair.e2**2)), 0.0))
    rng = stream(seed, "own strangers")
    chosen = rng.choice(len(nodes), STRANGERS, p=weights / weights.sum())
    peaks = []
    for node in chosen:
        response = belief.responses[rng.integers(len(belief.responses))]
        width = float(response.widths_d(np.array([lag_d]))[0])
        _, y = draw_pair(rng, pair.t2_d[:1], pair.t2_d, nodes[node][1].tau_d, 0.0, width)
        flux = rms * (y - y.mean()) / y.std() + pair.e2 * rng.standard_normal(y.size)
        peaks.append(
            peak_correlation(
                pair.t1_d, pair.y1, pair.e1, pair.t2_d, flux, pair.e2, lags, detrend=detrend
            )
        )
    return peaks
