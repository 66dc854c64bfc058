"""Where to search for the lag, on what grid, and on how few points to believe a correlation."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from planner.recovery.correlation import MIN_POINTS

__all__ = ["lag_grid", "minimum_overlap", "search_grid", "search_range"]


def search_range(duration_d: float, lag_hi_d: float) -> tuple[float, float]:
    """Return the lowest and the highest lag to try, in days.

    Parameters
    ----------
    duration_d : float
        From the first to the last epoch of the campaign, > 0.
    lag_hi_d : float
        Generous upper end of the lags to expect, > 0, observed frame.

    Returns
    -------
    lo, hi : float
        ``hi`` is `lag_hi_d`, but at most two thirds of the duration, so that a third of the
        data always overlaps; ``lo = -hi / 2``: negative lags cannot be real and so show how
        often noise makes a peak. Common practice, no source; searches of a half to two thirds of
        the duration are usual.
    """
    hi = min(2.0 / 3.0 * duration_d, lag_hi_d)
    return -0.5 * hi, hi


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
        if that took more than `points`; at least 25 points. A range of ``(-hi/2, hi)`` has 0 on
        the grid.
    """
    wanted = 3 * math.ceil((hi_d - lo_d) / (0.75 * sampling_d))
    return np.linspace(lo_d, hi_d, 1 + max(24, min(wanted, (points - 1) // 3 * 3)))


def search_grid(
    duration_d: float, lag_d: float, scatter_dex: float, sampling_d: float = 1.0
) -> NDArray[np.float64]:
    """Return the trial lags for a campaign that expects a lag.

    Parameters
    ----------
    duration_d : float
        From the first to the last epoch of the campaign, > 0.
    lag_d, scatter_dex : float
        Median and scatter of the log-normal expectation, observed frame. The search goes to three
        times the scatter above the median, within `search_range`.
    sampling_d : float
        Median interval between epochs of the better sampled curve; one night at least.
    """
    return lag_grid(*search_range(duration_d, lag_d * 10.0 ** (3.0 * scatter_dex)), sampling_d)


def minimum_overlap(epochs: int) -> int:
    """Return the fewest overlapping epochs on which to believe a correlation.

    A fifth of the epochs of the curve that has fewer, never under `MIN_POINTS`; common practice,
    no source. A random subset keeps about 63 % of the epochs, so a third of the duration
    overlapping still passes.
    """
    return max(MIN_POINTS, epochs // 5)
