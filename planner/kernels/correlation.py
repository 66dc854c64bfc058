"""Interpolated cross-correlation, its centroid, and the centroids of resampled curves.

Every time array is strictly ascending; every lag grid is ascending and evenly
spaced. A positive lag means that curve 2 repeats curve 1 later.
"""

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = [
    "correlate",
    "directly",
    "interpolate",
    "one_way",
    "peak_centroid",
    "pearson",
    "resample",
    "resampled_centroids",
]

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@njit(cache=True, nogil=True)
def interpolate(
    t_at: float,
    lags: Floats,
    first: int,
    end: int,
    per_step: float,
    t: Floats,
    f: Floats,
    slope: Floats,
    start: int,
    x: Floats,
) -> int:
    """Interpolate a curve at ``t_at + lags[first:end]``, into ``x[first:end]``, by segments.

    The lags of one segment are few and of unforeseeable number; doing what is left over after
    several lags at a time one by one would cost more than the rest. So each segment writes whole
    blocks of sixteen, and the next one overwrites what was too much.

    Parameters
    ----------
    lags, x : float64 (k + 16,)
        Evenly spaced, and result; sixteen more than the lags, as room for the last block.
    first, end : int
        ``t_at + lags[first]`` to ``t_at + lags[end - 1]`` lie inside the curve; first < end.
    per_step : float
        One over the spacing of the lags.
    t, f : float64 (m,)
        The curve, strictly ascending in time, m >= 2.
    slope : float64 (m - 1,)
        Slope of each segment.
    start : int
        Guess at the segment of the first lag.

    Returns
    -------
    int
        The segment of the first lag.
    """
    q_first, origin = t_at + lags[first], t_at + lags[0]
    while start > 0 and t[start] > q_first:
        start -= 1
    while t[start + 1] < q_first:
        start += 1
    # unsigned indices spare a test for negative ones: 30 % faster
    in_block, one, last = np.uintp(15), np.uintp(1), np.uintp(slope.size - 1)
    k, k_end, s = np.uintp(first), np.uintp(end), np.uintp(start)
    while k < k_end:
        since, f_s, slope_s = t[s] - t_at, f[s], slope[s]
        stop = k_end
        if s < last:
            stop = min(np.uintp(int((t[s + one] - origin) * per_step) + 1), k_end)
        if k < stop:
            for c in range((stop - k + in_block) & ~in_block):
                x[k + c] = f_s + slope_s * (lags[k + c] - since)
        k = stop
        s += one
    return start


@njit(cache=True, nogil=True)
def one_way(
    t_at: Floats, f_at: Floats, t_of: Floats, f_of: Floats, lags: Floats, min_points: int
) -> Floats:
    """Correlate curve `at` with curve `of` interpolated at ``t_at + lag``.

    Each epoch of `at` is one row: the interpolated curve at all lags that fall inside `of`, added
    to the running sums of those lags. Both ends of a row's range of lags move down from row to
    row, so every lag is covered by an unbroken run of epochs, ``enters`` to ``leaves`` - 1.

    Parameters
    ----------
    t_at, f_at : float64 (n,)
        Curve taken as it is; ascending.
    t_of, f_of : float64 (m,)
        Curve that is interpolated; strictly ascending.
    lags : float64 (k,)
        Ascending, evenly spaced.
    min_points : int
        Fewest epochs of `at` inside `of` for a correlation.

    Returns
    -------
    float64 (k,)
        r; NaN where too few points overlap or a curve is constant over them, see `pearson`.
    """
    n, last = lags.size, t_of.size - 1
    if n < 1 or last < 1 or t_at.size < min_points:
        return np.full(n, np.nan)
    y, f = f_at - np.mean(f_at), f_of - np.mean(f_of)
    slope = np.empty(last)
    for s in range(last):
        slope[s] = (f[s + 1] - f[s]) / (t_of[s + 1] - t_of[s])
    per_step = (n - 1) / (lags[n - 1] - lags[0]) if n > 1 else 1.0
    enters, leaves = np.full(n, y.size), np.full(n, y.size)
    roomy, x = np.zeros(n + 16), np.zeros(n + 16)
    roomy[:n] = lags
    sum_x, sum_xx, sum_xy = np.zeros(n), np.zeros(n), np.zeros(n)
    first, end, start = n, n, 0
    for i in range(y.size):
        t, y_i = t_at[i], y[i]
        while first > 0 and t + lags[first - 1] >= t_of[0]:
            first -= 1
            enters[first] = i
        while end > 0 and t + lags[end - 1] > t_of[last]:
            end -= 1
            leaves[end] = i
        if first >= end:
            continue
        start = interpolate(t, roomy, first, end, per_step, t_of, f, slope, start, x)
        row_x, row_sum_x = x[first:end], sum_x[first:end]
        row_sum_xx, row_sum_xy = sum_xx[first:end], sum_xy[first:end]
        for k in range(end - first):
            row_sum_x[k] += row_x[k]
            row_sum_xx[k] += row_x[k] * row_x[k]
            row_sum_xy[k] += row_x[k] * y_i
    sums = (sum_x, sum_xx, sum_xy)
    return pearson(sums, t_at, y, t_of, f, lags, enters, leaves, max(min_points, 2))


@njit(cache=True, nogil=True)
def pearson(
    sums: tuple[Floats, Floats, Floats],
    t_at: Floats,
    y: Floats,
    t_of: Floats,
    f: Floats,
    lags: Floats,
    enters: Ints,
    leaves: Ints,
    min_points: int,
) -> Floats:
    """Return r of each lag from its sums.

    Parameters
    ----------
    sums : three float64 (k,)
        Sums of x, x^2 and x y for the epochs that overlap.
    t_at, y : float64 (n,)
        Curve taken as it is, its fluxes about their mean.
    t_of, f : float64 (m,)
        Curve that is interpolated, its fluxes about their mean.
    lags : float64 (k,)
    enters, leaves : int64 (k,)
        Epochs ``enters`` to ``leaves`` - 1 overlap; none if ``leaves <= enters``.
    min_points : int
        At least 2.

    Returns
    -------
    float64 (k,)
        NaN with too few points, or where either curve varies over them by less than 1e-5 of its
        whole scatter: there r would be made of rounding.
    """
    sum_x, sum_xx, sum_xy = sums
    r, n = np.empty(lags.size), np.empty(lags.size)
    sum_y, sum_yy = np.empty(lags.size), np.empty(lags.size)
    run_y, run_yy = np.zeros(y.size + 1), np.zeros(y.size + 1)
    for i in range(y.size):
        run_y[i + 1] = run_y[i] + y[i]
        run_yy[i + 1] = run_yy[i] + y[i] * y[i]
    var_at, var_of = run_yy[y.size] / y.size, np.mean(f * f)
    for k in range(lags.size):
        a, b = np.uintp(enters[k]), np.uintp(max(leaves[k], enters[k]))
        n[k] = leaves[k] - enters[k]
        sum_y[k], sum_yy[k] = run_y[b] - run_y[a], run_yy[b] - run_yy[a]
    # No branches here, so that several lags are done at a time; what needs care comes after.
    for k in range(lags.size):
        per = 1.0 / max(n[k], 1.0)
        mean_x, mean_y, mean_xx = sum_x[k] * per, sum_y[k] * per, sum_xx[k] * per
        var_x, var_y = mean_xx - mean_x * mean_x, sum_yy[k] * per - mean_y * mean_y
        covariance = sum_xy[k] * per - mean_x * mean_y
        few, still = n[k] < min_points, var_x <= 1e-10 * var_of
        lost = (var_x < 1e-4 * mean_xx) | (var_y <= 1e-3 * var_at)  # digits, by the differences
        sound = not (few | still | lost)
        r[k] = covariance / np.sqrt(var_x * var_y if sound else 1.0)
        n[k] = n[k] if sound else 0.0
    for k in range(lags.size):
        if n[k] == 0.0:
            r[k] = np.nan
            a, b = enters[k], leaves[k]
            if b - a >= min_points:
                r[k] = directly(t_at[a:b] + lags[k], y[a:b], t_of, f, var_at, var_of)
    return r


@njit(cache=True, nogil=True)
def directly(
    when: Floats, y: Floats, t_of: Floats, f: Floats, var_at: float, var_of: float
) -> float:
    """Return r at one lag from differences to the means of the points that overlap.

    Slower than from the sums, but without their rounding where a curve varies little about a level
    far from its mean.
    """
    x = np.interp(when, t_of, f)
    dx, dy = x - np.mean(x), y - np.mean(y)
    var_x, var_y = np.mean(dx * dx), np.mean(dy * dy)
    if var_x > 1e-10 * var_of and var_y > 1e-10 * var_at:
        return float(np.mean(dx * dy) / np.sqrt(var_x * var_y))
    return np.nan


@njit(cache=True, nogil=True)
def correlate(
    t1: Floats, f1: Floats, t2: Floats, f2: Floats, lags: Floats, min_points: int
) -> Floats:
    """Return r at each lag, float64 (k,): mean of both directions, NaN where either has none."""
    # t2 - lag on curve 1 is -t2 + lag on curve 1 with time reversed
    r = one_way(-t2[::-1], f2[::-1].copy(), -t1[::-1], f1[::-1].copy(), lags, min_points)
    r_back = one_way(t1, f1, t2, f2, lags, min_points)
    for k in range(lags.size):
        r[k] = 0.5 * (r[k] + r_back[k])
    return r


@njit(cache=True, nogil=True)
def peak_centroid(lags: Floats, r: Floats, threshold: float) -> tuple[float, float, float, bool]:
    """Return (centroid, r_max, lag of the peak, at edge) of a correlation function.

    The centroid runs over the unbroken stretch around the highest peak with
    ``r >= threshold * r_max``; it is NaN unless the peak is positive and has a defined neighbour
    on both sides. With no defined r at all everything is NaN and `at edge` is False.
    """
    top = -1
    for k in range(lags.size):
        if not np.isnan(r[k]) and (top < 0 or r[k] > r[top]):
            top = k
    if top < 0:
        return np.nan, np.nan, np.nan, False
    r_max = r[top]
    at_edge = (
        top == 0 or top == lags.size - 1 or bool(np.isnan(r[top - 1])) or bool(np.isnan(r[top + 1]))
    )
    if at_edge or r_max <= 0.0:
        return np.nan, r_max, lags[top], at_edge
    lo = top
    while lo > 0 and r[lo - 1] >= threshold * r_max:
        lo -= 1
    hi = top
    while hi < lags.size - 1 and r[hi + 1] >= threshold * r_max:
        hi += 1
    weighted, total = 0.0, 0.0
    for k in range(lo, hi + 1):
        weighted += r[k] * lags[k]
        total += r[k]
    return weighted / total, r_max, lags[top], at_edge


@njit(cache=True, nogil=True)
def resample(
    t: Floats,
    f: Floats,
    e: Floats,
    picks: Ints,
    normals: Floats,
    t_out: Floats,
    f_out: Floats,
) -> int:
    """Fill `t_out`, `f_out` with one flux-randomised random subset; return its size.

    An epoch picked c times stays once, in time order, with error ``e / sqrt(c)``.
    """
    count = np.zeros(t.size)
    for p in picks:
        count[p] += 1.0
    n = 0
    for i in range(t.size):
        if count[i] > 0.0:
            t_out[n] = t[i]
            f_out[n] = f[i] + normals[i] * e[i] / np.sqrt(count[i])
            n += 1
    return n


@njit(cache=True, nogil=True)
def resampled_centroids(
    t1: Floats,
    f1: Floats,
    e1: Floats,
    t2: Floats,
    f2: Floats,
    e2: Floats,
    lags: Floats,
    min_points: int,
    threshold: float,
    picks1: Ints,
    normals1: Floats,
    picks2: Ints,
    normals2: Floats,
) -> Floats:
    """Return the centroid of each resample, float64 (b,); NaN where it has none.

    Parameters
    ----------
    t1, f1, e1, t2, f2, e2 : float64 (n1,), (n2,)
        Times, fluxes and errors, strictly ascending in time.
    lags : float64 (k,)
        Ascending.
    min_points : int
        As in `one_way`, applied to the subsets.
    threshold : float
        As in `peak_centroid`.
    picks1, picks2 : int64 (b, n1), (b, n2)
        Epochs drawn with replacement.
    normals1, normals2 : float64 (b, n1), (b, n2)
        Standard normal deviates, one for each epoch.
    """
    centroids = np.empty(picks1.shape[0])
    t1_b, f1_b = np.empty(t1.size), np.empty(t1.size)
    t2_b, f2_b = np.empty(t2.size), np.empty(t2.size)
    for b in range(centroids.size):
        n1 = resample(t1, f1, e1, picks1[b], normals1[b], t1_b, f1_b)
        n2 = resample(t2, f2, e2, picks2[b], normals2[b], t2_b, f2_b)
        r = correlate(t1_b[:n1], f1_b[:n1], t2_b[:n2], f2_b[:n2], lags, min_points)
        centroids[b] = peak_centroid(lags, r, threshold)[0]
    return centroids
