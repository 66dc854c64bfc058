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

from planner.kernels.joint_forecast import log_likelihoods
from planner.recovery.ambiguity import covariances
from planner.recovery.density import quantiles
from planner.recovery.information import Design

__all__ = ["Expected", "expected_recovery"]

Floats = NDArray[np.float64]

GRID, NEAR = 48, 13
"""Trial lags over the whole range, and more of them about the true one."""


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
    near = design.lag_d + np.linspace(-0.45, 0.45, NEAR) * abs(design.lag_d)
    lags = np.union1d(np.linspace(lo_d, hi_d, GRID), near[(near > lo_d) & (near < hi_d)])
    white, line, basis = covariances(design, np.append(lags, design.lag_d))
    offsets = basis.T @ white
    n, m = white.shape[1:]
    rms = design.scale * design.sigma
    unit = line[-1] - white[-1].T @ white[-1] + offsets[-1].T @ offsets[-1]
    truth = rms**2 * unit + np.diag(design.e2**2)
    normals = rng.standard_normal((n, simulations))
    normals -= basis @ (basis.T @ normals)
    noise = np.linalg.cholesky(truth) @ rng.standard_normal((m, simulations))
    stiffness = 1.0 / (scale_dex * math.log(10.0)) ** 2
    curves = np.array(
        [
            log_likelihoods(
                white[k], white[-1], offsets[k], line[k], design.e2, rms, normals, noise, stiffness
            )
            for k in range(lags.size)
        ]
    )
    if prior is not None:
        weight = np.asarray(prior(lags), dtype=np.float64)
        if not weight.max() > 0.0:
            return np.full((3, simulations), math.nan)
        with np.errstate(divide="ignore"):
            curves += np.log(weight)[:, None]
    wanted = np.array([0.16, 0.5, 0.84])
    density = np.exp(curves - curves.max(axis=0)).T
    return np.column_stack([quantiles(lags, one, wanted) for one in density])
