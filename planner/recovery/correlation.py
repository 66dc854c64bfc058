"""Interpolated cross-correlation and its centroid."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels.correlation import correlate, peak_centroid
from planner.recovery.curve import tidy_pair

__all__ = ["CENTROID_THRESHOLD", "MIN_POINTS", "centroid", "correlation", "even_lags"]

CENTROID_THRESHOLD = 0.8
"""Share of the peak above which the centroid is taken (Peterson et al. 2004, ApJ 613, 682)."""

MIN_POINTS = 5
"""Fewest overlapping epochs for a correlation; common practice, no source."""


def correlation(
    t1_d: ArrayLike,
    flux1: ArrayLike,
    t2_d: ArrayLike,
    flux2: ArrayLike,
    lags_d: ArrayLike,
    min_points: int = MIN_POINTS,
) -> NDArray[np.float64]:
    """Return the interpolated cross-correlation of two light curves at each lag.

    For each lag, curve 1 is interpolated linearly at ``t2 - lag`` and correlated with curve 2,
    and curve 2 is interpolated at ``t1 + lag`` and correlated with curve 1; the result is the
    mean of the two (Gaskell & Peterson 1987, ApJS 65, 1). Means and variances are those of the
    points that overlap at that lag (White & Peterson 1994, PASP 106, 879). Nothing is
    extrapolated.

    Parameters
    ----------
    t1_d, flux1 : array (n1,)
        Leading curve (continuum). Any order; epochs at one time are averaged; non-finite ones
        are left out.
    t2_d, flux2 : array (n2,)
        Following curve (line). A positive lag means that it repeats curve 1 later.
    lags_d : array (k,)
        Trial lags, ascending, evenly spaced.
    min_points : int
        Fewest overlapping epochs in each direction.

    Returns
    -------
    array (k,)
        NaN where either direction has too few points or a curve does not vary over them: the
        two directions are never mixed with a single one, which would put steps into the function.

    Raises
    ------
    ValueError
        If the lags are not ascending and evenly spaced.
    """
    one, two = tidy_pair(t1_d, flux1, 0.0, t2_d, flux2, 0.0)
    lags = even_lags(lags_d)
    return np.asarray(correlate(one.t_d, one.flux, two.t_d, two.flux, lags, min_points))


def even_lags(lags_d: ArrayLike) -> NDArray[np.float64]:
    """Return trial lags as the kernels want them. ValueError unless ascending, evenly spaced."""
    lags = np.array(lags_d, dtype=np.float64)
    steps = np.diff(lags)
    if steps.size and not (steps[0] > 0.0 and np.ptp(steps) <= 1e-6 * steps[0]):
        raise ValueError("the trial lags must be ascending and evenly spaced")
    return lags


def centroid(
    lags_d: ArrayLike, r: ArrayLike, threshold: float = CENTROID_THRESHOLD
) -> tuple[float, float, float, bool]:
    """Return the centroid of a correlation function around its highest peak.

    Parameters
    ----------
    lags_d, r : array (k,)
        Correlation function on ascending lags; NaN where undefined.
    threshold : float
        The centroid is ``sum(lag r) / sum(r)`` over the unbroken stretch of lags around the peak
        with ``r >= threshold * r_max``, as far as the lags go.

    Returns
    -------
    centroid_d : float
        NaN where r is nowhere positive, or the peak is at an edge.
    r_max, peak_d : float
        Height and lag of the highest point (the first of several equals).
    at_edge : bool
        True if the highest point lies at the end of the searched or of the defined lags, so that
        the true maximum may be elsewhere.
    """
    lags, values = np.array(lags_d, dtype=np.float64), np.array(r, dtype=np.float64)
    where, r_max, peak, at_edge = peak_centroid(lags, values, float(threshold))
    return float(where), float(r_max), float(peak), bool(at_edge)
