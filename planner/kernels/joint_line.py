"""Density of a line's light curve given the continuum's, for a stack of lags.

The continuum's covariance does not depend on the lag: its factor is one pass along the light
curve, and for each lag only the line's Schur complement is left. Householder rotations then make
that complement tridiagonal, so that any number of line scales costs one short pass each.
"""

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = ["line_log_density", "schur_complement", "walk_factor", "whitened"]

Floats = NDArray[np.float64]


@njit(cache=True, nogil=True)
def walk_factor(t_d: Floats, err: Floats, tau_d: float) -> tuple[Floats, Floats, Floats]:
    """Return (decay, gain, spread): the factor of ``exp(-|dt| / tau) + err^2`` in one pass.

    `spread` is the standard deviation of each epoch given those before it, `gain` the weight
    with which an epoch corrects the forecast, `decay` the forecast's damping since the epoch
    before. Errors in units of the walk's rms, > 0 where times repeat.
    """
    n = t_d.size
    decay, gain, spread = np.zeros(n), np.empty(n), np.empty(n)
    variance = 1.0
    for k in range(n):
        if k > 0:
            dt = t_d[k] - t_d[k - 1]
            a = math.exp(-dt / tau_d)
            decay[k] = a
            variance = a * a * variance - math.expm1(-2.0 * dt / tau_d)
        total = variance + err[k] * err[k]
        spread[k] = math.sqrt(total)
        gain[k] = variance / total
        variance = err[k] * err[k] * gain[k]
    return decay, gain, spread


@njit(cache=True, nogil=True)
def whitened(decay: Floats, gain: Floats, spread: Floats, columns: Floats) -> Floats:
    """Return the inverse of the walk's factor times `columns`, (n, m)."""
    n, m = columns.shape
    out = np.empty((n, m))
    forecast = np.zeros(m)
    for k in range(n):
        a, g, s = decay[k], gain[k], 1.0 / spread[k]
        for i in range(m):
            forecast[i] *= a
            miss = columns[k, i] - forecast[i]
            out[k, i] = miss * s
            forecast[i] += g * miss
    return out


@njit(cache=True, nogil=True)
def schur_complement(
    cross: Floats, basis: Floats, y: Floats, line: Floats
) -> tuple[Floats, Floats]:
    """Return covariance (m, m) and mean (m,) of the unit response given the continuum.

    Parameters
    ----------
    cross : float64 (n, m)
        Whitened covariance of continuum and response.
    basis : float64 (p, n)
        Orthonormal columns, transposed, that span the whitened offsets: they are unknown.
    y : float64 (n,)
        Whitened continuum in units of the walk's rms.
    line : float64 (m, m)
        The response's own covariance.
    """
    n, m = cross.shape
    covariance, mean = line.copy(), np.zeros(m)
    # In pieces small enough for the linear algebra library to stay in one thread.
    piece = max(1, 200_000 // (m * m))
    for start in range(0, n, piece):
        part = cross[start : start + piece]
        covariance -= np.dot(part.T, part)
    for k in range(n):
        for i in range(m):
            mean[i] += cross[k, i] * y[k]
    along = np.empty(m)
    for p in range(basis.shape[0]):
        of_y = 0.0
        along[:] = 0.0
        for k in range(n):
            u = basis[p, k]
            of_y += u * y[k]
            for i in range(m):
                along[i] += u * cross[k, i]
        for i in range(m):
            mean[i] -= along[i] * of_y
            for j in range(m):
                covariance[i, j] += along[i] * along[j]
    return covariance, mean


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract"})
def _tridiagonal(a: Floats, vectors: Floats) -> tuple[Floats, Floats]:
    """Reduce symmetric `a` in place, from its last row up, by Householder's reflections.

    Only the lower triangle is read and written.
    Returns the diagonal and the elements ``(k, k + 1)``; turns the rows of `vectors` alike.
    """
    m = a.shape[0]
    off = np.zeros(m)
    v, p = np.empty(m), np.empty(m)
    for k in range(m - 1, 1, -1):
        norm = 0.0
        last = a[k]
        for i in range(k):
            v[i] = last[i]
            norm += v[i] * v[i]
        norm = math.sqrt(norm)
        if norm == 0.0:
            continue
        alpha = -norm if v[k - 1] > 0.0 else norm
        off[k - 1] = alpha
        beta = 1.0 / (norm * norm - alpha * v[k - 1])
        v[k - 1] -= alpha
        p[:k] = 0.0
        for r in range(k):
            row, vr, total = a[r], v[r], 0.0
            for i in range(r):
                total += row[i] * v[i]
                p[i] += row[i] * vr
            p[r] += total + row[r] * vr
        along = 0.0
        for i in range(k):
            p[i] *= beta
            along += p[i] * v[i]
        for i in range(k):
            p[i] -= 0.5 * beta * along * v[i]
        for r in range(k):
            row, vr, pr = a[r], v[r], p[r]
            for i in range(r + 1):
                row[i] -= vr * p[i] + pr * v[i]
        for c in range(vectors.shape[0]):
            row, along = vectors[c], 0.0
            for i in range(k):
                along += v[i] * row[i]
            for i in range(k):
                row[i] -= beta * along * v[i]
    if m > 1:
        off[0] = a[1, 0]
    return np.diag(a).copy(), off


@njit(cache=True, nogil=True)
def _density_at(
    x: float, diagonal: Floats, off: Floats, vectors: Floats, x0: float, spread: float
) -> float:
    """Return ln density at ln scale = x, offset integrated out, times the scale's prior."""
    s = math.exp(x)
    s2 = s * s
    log_det, rr, r1, ones = 0.0, 0.0, 0.0, 0.0
    inverse, product, z, one, beside = 1.0, 1.0, 0.0, 0.0, 0.0
    for i in range(diagonal.size):
        step = beside * inverse
        z = vectors[0, i] - s * vectors[1, i] - step * z
        one = vectors[2, i] - step * one
        pivot = 1.0 + s2 * diagonal[i] - step * beside
        if not pivot > 0.0:
            return -math.inf
        beside, inverse = s2 * off[i], 1.0 / pivot
        product *= pivot
        if product > 1e200:
            log_det += math.log(product)
            product = 1.0
        rr += z * z * inverse
        r1 += z * one * inverse
        ones += one * one * inverse
    log_det += math.log(product)
    value = -0.5 * (log_det + math.log(ones) + rr - r1 * r1 / ones)
    if spread > 0.0:
        value -= 0.5 * ((x - x0) / spread) ** 2
    return value


@njit(cache=True, nogil=True)
def _over_scale(
    diagonal: Floats, off: Floats, vectors: Floats, x0: float, spread: float
) -> tuple[float, float]:
    """Return (ln of the mean density over the prior of ln scale, best ln scale).

    The peak by a scan of the prior and parabolas, then the trapezoidal rule in steps of 0.8 of
    the peak's own width. Data that contradict the prior by some three sigma may give a second,
    lower peak, which is left out: a few per cent of the mean.
    """
    if spread == 0.0:
        return _density_at(x0, diagonal, off, vectors, x0, 0.0), x0
    best, peak = x0, -math.inf
    for k in range(-3, 4):
        x = x0 + k * spread
        value = _density_at(x, diagonal, off, vectors, x0, spread)
        if value > peak:
            best, peak = x, value
    if peak == -math.inf:
        return peak, x0
    width, h = spread, 0.4 * spread
    for _ in range(20):
        low = _density_at(best - h, diagonal, off, vectors, x0, spread)
        high = _density_at(best + h, diagonal, off, vectors, x0, spread)
        if low > peak or high > peak:
            best, peak = (best - h, low) if low > high else (best + h, high)
            continue
        bend = (2.0 * peak - low - high) / (h * h)
        width = 1.0 / math.sqrt(max(bend, 1.0 / (spread * spread)))
        x = best + 0.5 * (high - low) / (h * max(bend, 1.0 / (spread * spread)))
        value = _density_at(x, diagonal, off, vectors, x0, spread)
        if value > peak:
            best, peak = x, value
        if h <= width:
            break
        h = max(0.5 * width, 0.2 * h)
    step, total = 0.8 * width, 1.0
    for sign in (-1.0, 1.0):
        for k in range(1, 12):
            value = _density_at(best + sign * k * step, diagonal, off, vectors, x0, spread) - peak
            total += math.exp(min(value, 30.0))
            if value < -16.0:
                break
    return peak + math.log(total * step / (spread * math.sqrt(2.0 * math.pi))), best


@njit(cache=True, nogil=True)
def line_log_density(
    factor: tuple[Floats, Floats, Floats],
    basis: Floats,
    y1: Floats,
    cross: Floats,
    line: Floats,
    y2: Floats,
    err2: Floats,
    log_scale: float,
    spread: float,
) -> tuple[Floats, Floats]:
    """Return ln p(line | continuum) and the best ln scale, (k,) each, of a stack of lags.

    Parameters
    ----------
    factor : three float64 (n,)
        From `walk_factor`.
    basis, y1 : float64 (p, n), (n,)
        See `schur_complement`.
    cross, line : float64 (k, n, m), (k, m, m)
        Unit covariances for each lag.
    y2, err2 : float64 (m,)
        Line and its errors, > 0.
    log_scale, spread : float
        Gaussian prior of ln(rms of the line's driver in the unit of `y2`); spread 0: known.

    The line's offset is integrated out under a flat prior of density 1 per unit of `y2`.
    """
    count, m = cross.shape[0], y2.size
    density, best = np.empty(count), np.empty(count)
    constant = -0.5 * (m - 1) * math.log(2.0 * math.pi) - np.log(err2).sum()
    vectors = np.empty((3, m))
    for k in range(count):
        white = whitened(factor[0], factor[1], factor[2], cross[k])
        covariance, mean = schur_complement(white, basis, y1, line[k])
        for i in range(m):
            vectors[0, i] = y2[i] / err2[i]
            vectors[1, i] = mean[i] / err2[i]
            vectors[2, i] = 1.0 / err2[i]
            for j in range(i + 1):
                covariance[i, j] /= err2[i] * err2[j]
        diagonal, off = _tridiagonal(covariance, vectors)
        value, best[k] = _over_scale(diagonal, off, vectors, log_scale, spread)
        density[k] = value + constant
    return density, best
