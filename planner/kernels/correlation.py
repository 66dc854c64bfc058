"""Interpolated cross-correlation, its centroid, and the centroids of resampled curves.

Every time array is strictly ascending; every lag grid is ascending and evenly
spaced. A positive lag means that curve 2 repeats curve 1 later.
"""

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = [
    "correlate",
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
    q: Floats,
    first: int,
    end: int,
    per_step: float,
    t: Floats,
    f: Floats,
    slope: Floats,
    start: int,
    stops: Ints,
    x: Floats,
) -> int:
    """Interpolate a curve at ``q[first:end]``, into ``x[first:end]``, segment by segment.

    The lags of one segment are few and of unforeseeable number, and mispredicted branches would
    cost more than the arithmetic. So each segment writes whole blocks of eight, and the next one
    overwrites what was too much.

    Parameters
    ----------
    q, x : float64 (k + 8,)
        Evenly spaced times, and result; eight more than the lags, as room for the last block.
    first, end : int
        ``q[first]`` to ``q[end - 1]`` lie inside the curve.
    per_step : float
        One over the spacing of `q`.
    t, f : float64 (m,)
        The curve, strictly ascending in time, m >= 2.
    slope : float64 (m - 1,)
        Slope of each segment.
    start : int
        Guess at the segment of ``q[first]``.
    stops : int64 (m - 1,)
        Scratch: the first lag beyond each segment.

    Returns
    -------
    int
        The segment of ``q[first]``.
    """
    while start > 0 and t[start] > q[first]:
        start -= 1
    while t[start + 1] < q[first]:
        start += 1
    q_0 = q[0]
    for s in range(stops.size):
        stops[s] = int((t[s + 1] - q_0) * per_step) + 1
    stops[stops.size - 1] = end
    block = np.uintp(8)  # unsigned indices spare a test for negative ones: 30 % faster
    k = np.uintp(first)
    for s in range(np.uintp(start), np.uintp(stops.size)):
        stop = np.uintp(min(stops[s], end))
        t_s, f_s, slope_s = t[s], f[s], slope[s]
        while True:
            for c in range(block):
                x[k + c] = f_s + slope_s * (q[k + c] - t_s)
            k += block
            if k >= stop:
                break
        k = stop
        if k >= end:
            break
    return start


@njit(cache=True, nogil=True)
def one_way(
    t_at: Floats, f_at: Floats, t_of: Floats, f_of: Floats, lags: Floats, min_points: int
) -> Floats:
    """Correlate curve `at` with curve `of` interpolated at ``t_at + lag``.

    Each epoch of `at` is one row: the interpolated curve at all lags that fall inside `of`, added
    to the running sums of those lags. Both ends of a row's range of lags move down from row to
    row, so every lag is covered by an unbroken run of epochs, ``enters`` to ``leaves`` - 1; the
    sums are taken about the values of the first of them, which keeps variances free of
    cancellation.

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
    y = f_at - np.mean(f_at)
    slope = np.empty(last)
    for s in range(last):
        slope[s] = (f_of[s + 1] - f_of[s]) / (t_of[s + 1] - t_of[s])
    per_step = (n - 1) / (lags[n - 1] - lags[0]) if n > 1 else 1.0
    stops = np.empty(last, np.int64)
    enters, leaves = np.full(n, y.size), np.full(n, y.size)
    q, x, x0, y0 = np.zeros(n + 8), np.zeros(n + 8), np.empty(n), np.empty(n)
    sum_x, sum_xx, sum_xy = np.zeros(n), np.zeros(n), np.zeros(n)
    first, end, reached, start = n, n, n, 0
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
        for k in range(n):
            q[k] = t + lags[k]
        start = interpolate(q, first, end, per_step, t_of, f_of, slope, start, stops, x)
        for k in range(first, min(end, reached)):
            x0[k], y0[k] = x[k], y_i
        reached = first
        row_x, row_x0, row_y0 = x[first:end], x0[first:end], y0[first:end]
        row_sum_x, row_sum_xx, row_sum_xy = sum_x[first:end], sum_xx[first:end], sum_xy[first:end]
        for k in range(end - first):
            dx = row_x[k] - row_x0[k]
            row_sum_x[k] += dx
            row_sum_xx[k] += dx * dx
            row_sum_xy[k] += dx * (y_i - row_y0[k])
    return pearson(sum_x, sum_xx, sum_xy, y0, y, enters, leaves, np.var(f_of), max(min_points, 2))


@njit(cache=True, nogil=True)
def pearson(
    sum_x: Floats,
    sum_xx: Floats,
    sum_xy: Floats,
    y0: Floats,
    y: Floats,
    enters: Ints,
    leaves: Ints,
    var_of: float,
    min_points: int,
) -> Floats:
    """Return r of each lag from its sums.

    Parameters
    ----------
    sum_x, sum_xx, sum_xy, y0 : float64 (k,)
        Sums of x, x^2 and x (y - y0) for the epochs that overlap, x about any value near them.
    y : float64 (n,)
        Fluxes about their mean.
    enters, leaves : int64 (k,)
        Epochs ``enters`` to ``leaves`` - 1 overlap; none if ``leaves <= enters``.
    var_of : float
        Variance of the whole interpolated curve.
    min_points : int
        At least 2.

    Returns
    -------
    float64 (k,)
        NaN with too few points, or where either curve varies over them by less than 1e-5 of its
        whole scatter: there r would be made of rounding.
    """
    r = np.full(sum_x.size, np.nan)
    run_y, run_yy = np.zeros(y.size + 1), np.zeros(y.size + 1)
    for i in range(y.size):
        run_y[i + 1] = run_y[i] + y[i]
        run_yy[i + 1] = run_yy[i] + y[i] * y[i]
    var_at = run_yy[y.size] / y.size
    for k in range(r.size):
        a, b = enters[k], leaves[k]
        n = b - a
        if n < min_points:
            continue
        mean_y = (run_y[b] - run_y[a]) / n
        var_y = (run_yy[b] - run_yy[a]) / n - mean_y * mean_y
        if var_y < 0.01 * var_at:  # the difference of running sums has lost digits
            mean_y, var_y = np.mean(y[a:b]), np.var(y[a:b])
        mean_x = sum_x[k] / n
        var_x = sum_xx[k] / n - mean_x * mean_x
        if var_x > 1e-10 * var_of and var_y > 1e-10 * var_at:
            covariance = sum_xy[k] / n - mean_x * (mean_y - y0[k])
            r[k] = covariance / np.sqrt(var_x * var_y)
    return r


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
