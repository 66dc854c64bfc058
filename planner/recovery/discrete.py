"""Discrete correlation: no interpolation, bins of equally many pairs of epochs."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels.discrete_correlation import binned_pairs
from planner.recovery.curve import tidy_pair

__all__ = ["DiscreteCorrelation", "DiscreteLag", "discrete_correlation", "discrete_lag"]

Floats = NDArray[np.float64]

MIN_PAIRS = 11
"""Fewest pairs in a bin for which Fisher's z is near Gaussian (Alexander 1997)."""


@dataclass(frozen=True, slots=True)
class DiscreteCorrelation:
    """The correlation in bins of lag, ascending, (k,); empty where there is a reason."""

    lags_d: Floats
    """Mean lag of the pairs of each bin."""
    r: Floats
    r_lo: Floats
    """Lower end of the 68 % interval."""
    r_hi: Floats
    pairs: NDArray[np.int64]
    """Pairs in each bin."""
    reason: str


@dataclass(frozen=True, slots=True)
class DiscreteLag:
    """Lag of the discrete correlation's peak; NaN where there is a reason."""

    lag_d: float
    lag_lo_d: float
    lag_hi_d: float
    r_max: float
    reason: str


def discrete_correlation(
    t1_d: ArrayLike,
    flux1: ArrayLike,
    error1: ArrayLike,
    t2_d: ArrayLike,
    flux2: ArrayLike,
    error2: ArrayLike,
    lo_d: float,
    hi_d: float,
    min_pairs: int = MIN_PAIRS,
) -> DiscreteCorrelation:
    """Return the discrete correlation function with z-transformed errors.

    Correlation of the pairs of epochs in each bin of lag (Edelson & Krolik 1988, ApJ 333, 646),
    with means and scatters of the bin's own pairs, bins of equal population in which no epoch
    appears twice, and errors from Fisher's z (Alexander 1997, in Astronomical Time Series, 163;
    moments of z as quoted from memory).

    Parameters
    ----------
    t1_d, flux1, error1 : array (n,)
        Leading curve (continuum). Any order; epochs at one time are averaged, unusable ones left
        out. The errors do not enter.
    t2_d, flux2, error2 : array (m,)
        Following curve (line).
    lo_d, hi_d : float
        Range of lags; bins reach at most so far.
    min_pairs : int
        Pairs in each bin, raised to 5 if less.
    """
    one, two = tidy_pair(t1_d, flux1, error1, t2_d, flux2, error2)
    if not lo_d < hi_d:
        return _nothing("the range of lags is empty")
    first, second = one.t_d.size, two.t_d.size
    if min(first, second) < min_pairs:
        return _nothing(f"a light curve has fewer than {min_pairs} usable epochs")
    if np.ptp(one.flux) == 0.0 or np.ptp(two.flux) == 0.0:
        return _nothing("a light curve does not vary at all")
    lag = (two.t_d - one.t_d[:, None]).ravel()
    inside = np.flatnonzero((lag >= lo_d) & (lag <= hi_d))
    order = inside[np.argsort(lag[inside], kind="stable")]
    lags, r, pairs = binned_pairs(
        lag[order], order // second, order % second, one.flux, two.flux, max(min_pairs, 5)
    )
    defined = np.isfinite(r)
    if not defined.any():
        return _nothing(f"no bin of lags holds {min_pairs} independent pairs")
    lags, r, pairs = lags[defined], r[defined], pairs[defined]
    mean, spread = _fisher_z(r, pairs)
    return DiscreteCorrelation(lags, r, np.tanh(mean - spread), np.tanh(mean + spread), pairs, "")


def _fisher_z(r: Floats, pairs: NDArray[np.int64]) -> tuple[Floats, Floats]:
    """Return mean and standard deviation of z = artanh(r), the true correlation taken as r."""
    k, rho = pairs - 1.0, np.clip(r, -1.0 + 1e-12, 1.0 - 1e-12)
    square = rho**2
    mean = np.arctanh(rho) + rho / (2.0 * k) * (
        1.0 + (5.0 + square) / (4.0 * k) + (11.0 + 2.0 * square + 3.0 * square**2) / (8.0 * k**2)
    )
    variance = (
        1.0 + (4.0 - square) / (2.0 * k) + (22.0 - 6.0 * square - 3.0 * square**2) / (6.0 * k**2)
    ) / k
    return mean, np.sqrt(variance)


def discrete_lag(correlation: DiscreteCorrelation) -> DiscreteLag:
    """Return the lag of the highest peak, and its 68 % interval.

    The peak by likelihood: each bin's z is Gaussian and independent, so the probability that a bin
    is the highest of all is an integral over its z of the others' chances to lie below it. The lag
    is the bin with the highest r; the interval is that of the cumulative probability, linear
    between bins, widened where needed to hold the lag.

    Parameters
    ----------
    correlation : DiscreteCorrelation
    """
    if correlation.reason:
        return DiscreteLag(math.nan, math.nan, math.nan, math.nan, correlation.reason)
    top = int(np.argmax(correlation.r))
    r_max = float(correlation.r[top])
    if r_max <= 0.0:
        reason = "the light curves are nowhere positively correlated"
    elif top in {0, correlation.r.size - 1}:
        reason = "the correlation peaks at the edge of the lags that can be searched"
    else:
        lag = float(correlation.lags_d[top])
        lo, hi = _interval(correlation.lags_d, _highest(correlation))
        return DiscreteLag(lag, min(lo, lag), max(hi, lag), r_max, "")
    return DiscreteLag(math.nan, math.nan, math.nan, r_max, reason)


def _highest(correlation: DiscreteCorrelation) -> Floats:
    """Return the probability of each bin to be the highest."""
    from scipy.special import log_ndtr

    mean, spread = _fisher_z(correlation.r, correlation.pairs)
    z = np.linspace((mean - 6.0 * spread).max(), (mean + 6.0 * spread).max(), 400)[:, None]
    away = (z - mean) / spread
    below = log_ndtr(away)
    log_density = -0.5 * away**2 - np.log(spread) + below.sum(axis=1, keepdims=True) - below
    probability = np.exp(log_density - log_density.max()).sum(axis=0)
    return np.asarray(probability / probability.sum())


def _interval(lags: Floats, probability: Floats) -> tuple[float, float]:
    """Return the central 68 % of a probability spread evenly over each bin."""
    edges = np.concatenate([lags[:1], 0.5 * (lags[1:] + lags[:-1]), lags[-1:]])
    below = np.concatenate([[0.0], np.cumsum(probability)])
    lo, hi = np.interp([0.16, 0.84], below, edges)
    return float(lo), float(hi)


def _nothing(reason: str) -> DiscreteCorrelation:
    """Return the answer for data without a correlation."""
    none = np.empty(0)
    return DiscreteCorrelation(none, none, none, none, np.empty(0, dtype=np.int64), reason)
