"""Claim and correctness, kept apart: an observer sees only the first.

Every function works on single values and elementwise on arrays.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.model.campaign import SuccessRule
from planner.recovery.lag import LagResult

__all__ = ["is_claim", "is_right", "passes_cuts"]


def passes_cuts(
    lag_d: ArrayLike,
    lag_lo_d: ArrayLike,
    lag_hi_d: ArrayLike,
    r_max: ArrayLike,
    in_peak: ArrayLike,
    rule: SuccessRule,
) -> NDArray[np.bool_]:
    """Return whether recovered lags pass the success rule's quality cuts.

    A claim is a positive lag with a peak correlation above `rule.r_max_above`, half the width of
    its 68 % interval below `rule.error_below` of the lag, the lag more than `rule.sigma_above`
    times its lower error from zero, and more than the share `rule.in_peak_above` of the resampled
    lags in the primary peak. NaN (no lag) passes nothing.

    Parameters
    ----------
    lag_d, lag_lo_d, lag_hi_d : array (...)
        Lag and ends of its 68 % interval.
    r_max : array (...)
        Peak of the correlation function; an infinite one passes (methods without correlation).
    in_peak : array (...)
        Share of the lag's probability in the primary peak.
    rule : SuccessRule
    """
    lag, lo, hi, r, share = (
        np.asarray(a, dtype=np.float64) for a in (lag_d, lag_lo_d, lag_hi_d, r_max, in_peak)
    )
    return np.asarray(
        (lag > 0.0)
        & (r > rule.r_max_above)
        & (share > rule.in_peak_above)
        & (0.5 * (hi - lo) < rule.error_below * lag)
        & (lag > rule.sigma_above * (lag - lo))
    )


def is_claim(result: LagResult, rule: SuccessRule) -> bool:
    """Return whether one recovery would be claimed as a lag; see `passes_cuts`."""
    return bool(
        passes_cuts(
            result.lag_d, result.lag_lo_d, result.lag_hi_d, result.r_max, result.in_peak, rule
        )
    )


def is_right(lag_d: ArrayLike, true_lag_d: ArrayLike, within: float) -> NDArray[np.bool_]:
    """Return whether lags lie within the fraction `within` of the true ones; NaN never does."""
    lag, truth = np.asarray(lag_d, dtype=np.float64), np.asarray(true_lag_d, dtype=np.float64)
    return np.asarray(np.abs(lag - truth) <= within * truth)
