"""Where to search for the lag, on what grid, and on how few points to believe a correlation."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from planner.recovery.correlation import MIN_POINTS

__all__ = ["lag_grid", "minimum_overlap", "search_range"]


def search_range(duration_d: float, lag_hi_d: float, timescale_d: float) -> tuple[float, float]:
    """Return the lowest and the highest lag to try, in days.

    Parameters
    ----------
    duration_d : float
        From the first to the last epoch of the campaign, > 0.
    lag_hi_d : float
        Generous upper end of the lags to expect, > 0, observed frame.
    timescale_d : float
        Damping timescale to expect of the continuum, > 0, observed frame.

    Returns
    -------
    lo, hi : float
        Half a timescale below zero, and half a timescale above `lag_hi_d`; neither farther from
        zero than two thirds of the duration, so that a third of the data always overlaps.

    Notes
    -----
    The correlation function is as wide as the continuum's autocorrelation, which for a damped
    random walk stays above 0.8 out to 0.22 timescales on either side of its peak. A search that
    ends closer cuts the stretch that the centroid is taken over, and drags it inwards: in trials
    with a search barely wider than the lag's prior, up to a quarter of the claims were wrong.
    """
    limit = 2.0 / 3.0 * duration_d
    margin = 0.5 * timescale_d
    return -min(margin, limit), min(lag_hi_d + margin, limit)


def lag_grid(lo_d: float, hi_d: float, sampling_d: float, points: int = 241) -> NDArray[np.float64]:
    """Return evenly spaced trial lags from `lo_d` to `hi_d`, both included.

    Parameters
    ----------
    lo_d, hi_d : float
        Search range, ``lo_d < hi_d``.
    sampling_d : float
        Median interval between epochs of the better sampled curve, > 0.
    points : int
        Most points allowed.

    Returns
    -------
    array (k,)
        Step of a quarter of the sampling (common practice, no source: a tenth to a half), coarser
        if that took more than `points`; at least 25 points.
    """
    wanted = 1 + math.ceil((hi_d - lo_d) / (0.25 * sampling_d))
    return np.linspace(lo_d, hi_d, max(25, min(wanted, points)))


def minimum_overlap(epochs: int) -> int:
    """Return the fewest overlapping epochs on which to believe a correlation.

    A fifth of the epochs of the curve that has fewer, never under `MIN_POINTS`; common practice,
    no source. A random subset keeps about 63 % of the epochs, so a third of the duration
    overlapping still passes.
    """
    return max(MIN_POINTS, epochs // 5)
