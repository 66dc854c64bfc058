"""The lag of a line behind its continuum, with an honest error, or the reason for none."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels.correlation import correlate, peak_centroid, resampled_centroids
from planner.recovery.correlation import CENTROID_THRESHOLD, centroid, even_lags
from planner.recovery.curve import Curve, tidy_pair
from planner.recovery.primary import PrimaryPeak, overlap_weight, primary_peak
from planner.recovery.search import minimum_overlap

__all__ = [
    "BATCH",
    "MIN_SHARE",
    "LagResult",
    "peak_correlation",
    "peak_correlations",
    "recover_lag",
]

MIN_SHARE = 0.5
"""Fewest resamples, as a share, that must give a lag: percentiles of a minority are no interval."""

BATCH = 24
"""Resamples drawn at a time; those of a recovery that ends early are the first of the whole."""

ONE_SIGMA = (0.1587, 0.5, 0.8413)
"""Quantiles at the median and one sigma of a Gaussian on either side."""


@dataclass(frozen=True, slots=True)
class LagResult:
    """What the correlation method makes of two light curves; lags in observed-frame days."""

    lag_d: float
    """Median of the resampled centroids in the primary peak; NaN where there is no lag."""
    lag_lo_d: float
    """Lower end of the central 68 % of these centroids."""
    lag_hi_d: float
    """Upper end."""
    centroid_d: float
    """Centroid of the data's own correlation function."""
    r_max: float
    """Height of the data's own peak; NaN where no correlation is defined."""
    peak_d: float
    """Lag of that peak."""
    share: float
    """Share of the resamples that gave a lag."""
    in_peak: float
    """Share of these lags in the primary peak; NaN where there is no lag."""
    aliases: tuple[tuple[float, float], ...]
    """Lag and share of every other peak of their distribution, largest first."""
    reason: str
    """Why there is no lag; empty where there is one."""
    lags_d: NDArray[np.float64]
    """Trial lags, (k,)."""
    r: NDArray[np.float64]
    """The data's own correlation function, (k,)."""
    centroids_d: NDArray[np.float64]
    """Centroid of each resample that gave one."""
    drawn: int
    """Resamples drawn, with or without a lag."""
    scatter_d: float
    """Standard deviation of the centroids in the primary peak; NaN where there is no lag."""
    rival: float
    """Height of the second tallest peak of their weighted distribution over that of the primary
    one; NaN where there is no lag."""


def recover_lag(
    t1_d: ArrayLike,
    flux1: ArrayLike,
    error1: ArrayLike,
    t2_d: ArrayLike,
    flux2: ArrayLike,
    error2: ArrayLike,
    lags_d: ArrayLike,
    resamples: int,
    rng: np.random.Generator,
    min_points: int | None = None,
    r_max_above: float = 0.0,
    detrend: bool = False,
    decided: Callable[[LagResult], bool] | None = None,
) -> LagResult:
    """Recover a lag by interpolated cross-correlation, its error by resampling.

    Centroid of the correlation function over ``r >= 0.8 r_max``; errors from flux randomisation
    and random subset selection (Peterson et al. 1998, PASP 110, 660; Peterson et al. 2004, ApJ
    613, 682): each resample draws as many epochs of each curve as there are, with replacement,
    keeps each distinct one once with its error reduced by the square root of the times it was
    drawn (Welsh 1999, PASP 111, 1347), adds Gaussian errors, and takes the centroid. Of the
    centroids' distribution, weighted by the epochs that overlap at each lag, only the primary
    peak counts (`primary_peak`).

    Parameters
    ----------
    t1_d, flux1, error1 : array (n1,)
        Continuum. Any order; epochs at one time are averaged, unusable ones left out.
    t2_d, flux2, error2 : array (n2,)
        Line.
    lags_d : array (k,)
        Trial lags, ascending, evenly spaced, observed frame.
    resamples : int
        Resampled pairs of curves.
    rng : numpy.random.Generator
        Left untouched where the data themselves have no lag.
    min_points : int or None
        Fewest overlapping epochs in each direction; None: `minimum_overlap` of the curve with
        fewer epochs.
    r_max_above : float
        A peak that is not higher gives no lag, and no resampling is done: it would not be claimed.
    detrend : bool
        Take a straight line, fitted with the errors as weights, off each curve first: slow power
        that the campaign is too short to resolve biases lags low (Welsh 1999).
    decided : callable or None
        Shown the result after every batch of `BATCH` resamples, unless fewer are left; where it
        returns True, no more are drawn, and lag and interval are those of fewer resamples. None:
        all are drawn.

    Returns
    -------
    LagResult
        Always; data that allow no lag give NaN and the reason.

    Raises
    ------
    ValueError
        If the lags are not ascending and evenly spaced.
    """
    one, two = tidy_pair(t1_d, flux1, error1, t2_d, flux2, error2)
    if detrend:
        one, two = one.without_trend(), two.without_trend()
    if min_points is None:
        min_points = minimum_overlap(min(one.t_d.size, two.t_d.size))
    lags = even_lags(lags_d)
    r = correlate(one.t_d, one.flux, two.t_d, two.flux, lags, min_points)
    own = centroid(lags, r)
    reason = _no_centroid(own, r_max_above)
    if reason:
        return _result(own, lags, r, np.empty(0), 0, None, reason)
    weight = overlap_weight(one.t_d, two.t_d, lags)
    duration = float(max(one.t_d[-1], two.t_d[-1]))
    drawn = np.empty(0)
    while drawn.size < resamples:
        batch = min(BATCH, resamples - drawn.size)
        drawn = np.concatenate([drawn, _resampled(one, two, lags, batch, rng, min_points)])
        if decided is not None and drawn.size + BATCH <= resamples:
            found = _of_resamples(own, lags, r, drawn, weight, duration)
            if decided(found):
                return found
    return _of_resamples(own, lags, r, drawn, weight, duration)


def _of_resamples(
    own: tuple[float, float, float, bool],
    lags: NDArray[np.float64],
    r: NDArray[np.float64],
    drawn: NDArray[np.float64],
    weight: NDArray[np.float64],
    duration_d: float,
) -> LagResult:
    """Return what the resamples drawn so far say."""
    centroids = drawn[np.isfinite(drawn)]
    share = centroids.size / max(drawn.size, 1)
    if share < MIN_SHARE:
        reason = f"only {100.0 * share:.0f} % of the resampled light curves gave a lag"
        return _result(own, lags, r, centroids, drawn.size, None, reason)
    peak = primary_peak(lags, centroids, weight, duration_d)
    return _result(own, lags, r, centroids, drawn.size, peak, "")


def peak_correlation(
    t1_d: ArrayLike,
    flux1: ArrayLike,
    error1: ArrayLike,
    t2_d: ArrayLike,
    flux2: ArrayLike,
    error2: ArrayLike,
    lags_d: ArrayLike,
    *,
    detrend: bool = False,
) -> float:
    """Return the height of the correlation function's peak if it could be claimed as a lag.

    What unrelated curves reach at the same epochs tells what a peak is worth. NaN where the peak
    has no centroid, or none at a positive lag. Arguments as for `recover_lag`.
    """
    return peak_correlations(t1_d, flux1, error1, t2_d, [flux2], error2, lags_d, detrend=detrend)[0]


def peak_correlations(
    t1_d: ArrayLike,
    flux1: ArrayLike,
    error1: ArrayLike,
    t2_d: ArrayLike,
    fluxes2: Sequence[ArrayLike],
    error2: ArrayLike,
    lags_d: ArrayLike,
    *,
    detrend: bool = False,
) -> list[float]:
    """Return `peak_correlation` of each of several lines measured at the same epochs."""
    lags, peaks = even_lags(lags_d), []
    for flux2 in fluxes2:
        one, two = tidy_pair(t1_d, flux1, error1, t2_d, flux2, error2)
        if detrend:
            one, two = one.without_trend(), two.without_trend()
        least = minimum_overlap(min(one.t_d.size, two.t_d.size))
        r = correlate(one.t_d, one.flux, two.t_d, two.flux, lags, least)
        lag, r_max, _, _ = peak_centroid(lags, r, CENTROID_THRESHOLD)
        peaks.append(float(r_max) if lag > 0.0 else np.nan)
    return peaks


def _no_centroid(own: tuple[float, float, float, bool], r_max_above: float) -> str:
    """Return why a correlation function has no centroid worth having, or nothing."""
    _, r_max, _, at_edge = own
    if np.isnan(r_max):
        return "the light curves overlap in too few points, or do not vary, at every lag searched"
    if r_max <= 0.0:
        return "the light curves are nowhere positively correlated"
    if at_edge:
        return "the correlation peaks at the edge of the lags that can be searched"
    if r_max <= r_max_above:
        return f"the correlation peaks at {r_max:.2f}, not above {r_max_above:g}"
    return ""


def _resampled(
    one: Curve,
    two: Curve,
    lags: NDArray[np.float64],
    resamples: int,
    rng: np.random.Generator,
    min_points: int,
) -> NDArray[np.float64]:
    """Return the centroid of each resample; NaN where it has none."""
    deviates = []
    for curve in (one, two):
        n = curve.t_d.size
        deviates += [rng.integers(0, n, (resamples, n)), rng.standard_normal((resamples, n))]
    return np.asarray(
        resampled_centroids(
            one.t_d, one.flux, one.error, two.t_d, two.flux, two.error,
            lags, min_points, CENTROID_THRESHOLD, *deviates,
        )
    )  # fmt: skip


def _result(
    own: tuple[float, float, float, bool],
    lags: NDArray[np.float64],
    r: NDArray[np.float64],
    centroids: NDArray[np.float64],
    drawn: int,
    peak: PrimaryPeak | None,
    reason: str,
) -> LagResult:
    """Put the record together; percentiles as for one sigma of a Gaussian."""
    lo = lag = hi = scatter = np.nan
    if peak is not None:
        inside = np.sort(centroids[(centroids >= peak.lo_d) & (centroids <= peak.hi_d)])
        lo, lag, hi = (_quantile(inside, share) for share in ONE_SIGMA)
        off = inside - inside.sum() / inside.size
        scatter = float(np.sqrt(off @ off / inside.size))
    return LagResult(
        lag_d=lag,
        lag_lo_d=lo,
        lag_hi_d=hi,
        centroid_d=own[0],
        r_max=own[1],
        peak_d=own[2],
        share=centroids.size / max(drawn, 1),
        in_peak=np.nan if peak is None else peak.share,
        aliases=() if peak is None else peak.others,
        reason=reason,
        lags_d=lags,
        r=r,
        centroids_d=centroids,
        drawn=drawn,
        scatter_d=scatter,
        rival=np.nan if peak is None else peak.rival,
    )


def _quantile(ascending: NDArray[np.float64], share: float) -> float:
    """Return the quantile as NumPy's own default does, at a twentieth of its cost."""
    place = share * (ascending.size - 1)
    below = int(place)
    above = min(below + 1, ascending.size - 1)
    return float(ascending[below] + (place - below) * (ascending[above] - ascending[below]))
