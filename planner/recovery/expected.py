"""How often the likelihood would recover a lag, without a full recovery for each simulation.

The log likelihood ratio of a lag against the truth has the mean and spread of the divergence (see
`ambiguity`), but whether a recovery succeeds depends on the whole curve: on how many lags compete
and how alike they are. So the curve itself is drawn. Its costly part, the matrices of each trial
lag, depends on the epochs and not on the fluxes: worked out once, it serves any number of draws of
variability and noise. The walk and the response are those of the truth; the scale's uncertainty
enters through the line's expected flux alone, to which the line answers linearly.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.kernels.joint_forecast import log_likelihoods, simulated_lines
from planner.recovery.ambiguity import factor_of
from planner.recovery.information import Design, free
from planner.recovery.response import cross_covariance, line_covariance

__all__ = ["Expected", "expected_recovery"]

Floats = NDArray[np.float64]

GRID, NEAR = 49, 13
"""Trial lags over the whole range, and more of them about the true one."""

STEP = 8
"""Every so many of them are tried first, those between where it matters."""

HOPELESS = 10.0
"""So far below the best in ln likelihood at both ends, an interval is not looked into."""

ROUGH = 0.05
"""Share of the highest density by which it may stray from a straight line."""

BLOCK = 30_000
"""Elements of the matrices that are held at a time: they stay in the processor's cache."""


@dataclass(frozen=True, slots=True)
class Expected:
    """Shares of the simulated recoveries."""

    success: float
    """Claimed and right."""
    claims: float
    """Interval narrow enough."""
    right: float
    """Median close enough to the truth, claimed or not."""
    simulations: int
    reason: str
    """Why some draws count as failures: the first reason found; empty if none."""


def expected_recovery(
    designs: Sequence[Design],
    lo_d: float,
    hi_d: float,
    within: float,
    error_below: float,
    rng: np.random.Generator,
    simulations: int = 16,
    scale_dex: float = 0.15,
    prior: Callable[[Floats], Floats] | None = None,
) -> Expected:
    """Return how often a posterior's median would be right and its interval narrow.

    Parameters
    ----------
    designs : sequence of Design
        Draws of truth and epochs.
    lo_d, hi_d : float
        Range of lags searched.
    within : float
        Right: median within this share of the true lag.
    error_below : float
        Claimed: half the 68 % interval below this share of the median.
    rng : numpy.random.Generator
    simulations : int
        Light curves for each design.
    scale_dex : float
        Scatter of the scale's prior, > 0.
    prior : function or None
        Density of the lag's prior, unnormalised; None: flat. One that excludes every lag lets
        nothing be recovered.
    """
    claims, rights, reason = [], [], ""
    for design in designs:
        if design.reason or not lo_d < hi_d:
            reason = reason or design.reason or "the range of lags is empty"
            lags = np.full((3, simulations), math.nan)
        else:
            lags = _simulated(design, lo_d, hi_d, rng, simulations, scale_dex, prior)
        lo, median, hi = lags
        rights.append(np.abs(median - design.lag_d) <= within * abs(design.lag_d))
        claims.append(0.5 * (hi - lo) < error_below * median)
    claimed, right = np.concatenate(claims), np.concatenate(rights)
    return Expected(
        success=float(np.mean(claimed & right)),
        claims=float(np.mean(claimed)),
        right=float(np.mean(right)),
        simulations=claimed.size,
        reason=reason,
    )


def _simulated(
    design: Design,
    lo_d: float,
    hi_d: float,
    rng: np.random.Generator,
    simulations: int,
    scale_dex: float,
    prior: Callable[[Floats], Floats] | None,
) -> Floats:
    """Return 16th, 50th and 84th percentile of each simulated posterior, (3, simulations)."""
    likelihoods = _likelihoods(design, rng, simulations, scale_dex)

    def densities(lags: Floats) -> Floats:
        """Return ln density at each lag, (k, simulations)."""
        curves = likelihoods(lags)
        if prior is not None:
            with np.errstate(divide="ignore"):
                curves += np.log(np.asarray(prior(lags), dtype=np.float64))[:, None]
        return curves

    near = design.lag_d + np.linspace(-0.45, 0.45, NEAR) * abs(design.lag_d)
    lags = np.union1d(np.linspace(lo_d, hi_d, GRID), near[(near > lo_d) & (near < hi_d)])
    # A prior may leave nothing but what lies between two of the lags that are tried first.
    kept, curves = _refined(densities, lags, design.lag_d, STEP if prior is None else 1)
    top = curves.max(axis=0)
    if not np.all(np.isfinite(top)):
        return np.full((3, simulations), math.nan)
    return _quantiles(lags[kept], np.exp(curves - top), (0.16, 0.5, 0.84))


def _refined(
    densities: Callable[[Floats], Floats], lags: Floats, truth_d: float, step: int
) -> tuple[NDArray[np.bool_], Floats]:
    """Return which lags were tried, (k,), and ln density at these, (tried, simulations).

    The truth's lag and each `step`-th are tried; then the middle of each interval whose ends give
    hope, and on to either side of it, unless the density there is what a straight line says.
    """
    tried = np.arange(lags.size) % step == 0
    tried[-1] = tried[min(np.searchsorted(lags, truth_d), lags.size - 1)] = True
    first = densities(lags[tried])
    curves = np.full((lags.size, first.shape[1]), -math.inf)
    curves[tried] = first
    ends = np.flatnonzero(tried)
    left, right = ends[:-1], ends[1:]
    while True:
        hope = np.maximum(curves[left], curves[right]) > curves.max(axis=0) - HOPELESS
        on = (right - left > 1) & np.any(hope, axis=1)
        if not on.any():
            return tried, curves[tried]
        left, right = left[on], right[on]
        middle = (left + right) // 2
        curves[middle] = densities(lags[middle])
        tried[middle] = True
        top = curves.max(axis=0)
        start, found, end = (np.exp(curves[k] - top) for k in (left, middle, right))
        share = ((lags[middle] - lags[left]) / (lags[right] - lags[left]))[:, None]
        rough = np.any(np.abs(found - start - share * (end - start)) > ROUGH, axis=1)
        left, middle, right = left[rough], middle[rough], right[rough]
        left, right = np.append(left, middle), np.append(middle, right)


def _quantiles(x: Floats, density: Floats, probabilities: Sequence[float]) -> Floats:
    """Return quantiles of many densities (k, r) at once; see `planner.recovery.density`."""
    step = np.diff(x)[:, None]
    below = np.zeros(density.shape)
    np.cumsum(0.5 * step * (density[:-1] + density[1:]), axis=0, out=below[1:])
    found, columns = [], np.arange(density.shape[1])
    for share in probabilities:
        wanted = share * below[-1]
        k = np.clip((below <= wanted).sum(axis=0) - 1, 0, step.size - 1)
        rest, left, width = wanted - below[k, columns], density[k, columns], step[k, 0]
        slope = (density[k + 1, columns] - left) / width
        # The root of slope u^2 / 2 + left u = rest in the form that does not cancel.
        root = np.sqrt(np.maximum(left**2 + 2.0 * slope * rest, 0.0)) + left
        into = np.divide(2.0 * rest, root, out=np.zeros_like(rest), where=root > 0.0)
        found.append(x[k] + np.clip(into, 0.0, width))
    return np.array(found)


def _likelihoods(
    design: Design, rng: np.random.Generator, simulations: int, scale_dex: float
) -> Callable[[Floats], Floats]:
    """Draw light curves; return the function that gives their log likelihoods at any lags."""
    t1, t2, tau = design.t1_d, design.t2_d, design.tau_d
    factor, basis = factor_of(design)
    rms = design.scale * design.sigma
    stiffness = 1.0 / (scale_dex * math.log(10.0)) ** 2
    normals = rng.standard_normal((simulations, t1.size))
    normals = np.ascontiguousarray(free(normals.T, basis).T)
    own = rng.standard_normal((simulations, t2.size))

    def covariances(lags: Floats) -> tuple[Floats, Floats]:
        return (
            cross_covariance(t1, t2, lags, tau, design.response),
            line_covariance(t2, lags, tau, design.response),
        )

    cross, line = covariances(np.array([design.lag_d]))
    lines = simulated_lines(factor, basis, cross[0], line[0], design.e2, rms, normals, own)
    block = max(1, BLOCK // (t2.size * max(t1.size, t2.size)))

    def curves(lags: Floats) -> Floats:
        parts = [
            log_likelihoods(
                factor, basis, *covariances(lags[k : k + block]), design.e2, rms, normals, lines,
                stiffness,
            )
            for k in range(0, lags.size, block)
        ]  # fmt: skip
        return np.concatenate([np.empty((0, simulations)), *parts])

    return curves
