"""Log likelihood at one lag of many simulated data sets that share their epochs."""

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = ["log_likelihoods"]

Floats = NDArray[np.float64]


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract"})
def _lower_factor(a: Floats) -> bool:
    """Replace the lower triangle of `a` by its Cholesky factor; False if it has none."""
    m = a.shape[0]
    for i in range(m):
        row = a[i]
        for j in range(i + 1):
            other, total = a[j], 0.0
            for k in range(j):
                total += row[k] * other[k]
            if i == j:
                rest = row[i] - total
                if not rest > 0.0:
                    return False
                row[i] = math.sqrt(rest)
            else:
                row[j] = (row[j] - total) / other[j]
    return True


@njit(cache=True, nogil=True)
def log_likelihoods(
    white: Floats,
    white0: Floats,
    offsets: Floats,
    line: Floats,
    err2: Floats,
    rms: float,
    normals1: Floats,
    noise2: Floats,
    stiffness: float,
) -> Floats:
    """Return ln p(line | continuum), constants left out, at one trial lag, (r,).

    Parameters
    ----------
    white, white0 : float64 (n, m)
        Whitened unit covariance of continuum and response at the trial and at the true lag.
    offsets : float64 (p, m)
        Projections of `white` on the whitened, orthonormal offsets of the continuum.
    line : float64 (m, m)
        The response's own unit covariance at the trial lag.
    err2 : float64 (m,)
        Errors of the line.
    rms : float
        Rms of the line's driver in the line's unit.
    normals1 : float64 (n, r)
        Whitened continua, one column for each data set, free of the offsets.
    noise2 : float64 (m, r)
        What the line has beyond its mean given the continuum.
    stiffness : float
        One over the prior variance of ln scale, to which the mean answers linearly. The offset is
        integrated out.
    """
    m = white.shape[1]
    r = normals1.shape[1]
    covariance = rms * rms * (line - np.dot(white.T, white) + np.dot(offsets.T, offsets))
    for i in range(m):
        covariance[i, i] += err2[i] * err2[i]
    out = np.empty(r)
    if not _lower_factor(covariance):
        out[:] = -math.inf
        return out
    columns = np.empty((m, 2 * r + 1))
    columns[:, :r] = rms * np.dot((white0 - white).T, normals1) + noise2
    columns[:, r : 2 * r] = rms * np.dot(white.T, normals1)
    columns[:, 2 * r] = 1.0
    log_det = 0.0
    for i in range(m):
        row = columns[i]
        for k in range(i):
            factor, above = covariance[i, k], columns[k]
            for c in range(2 * r + 1):
                row[c] -= factor * above[c]
        row /= covariance[i, i]
        log_det += math.log(covariance[i, i])
    sums = np.zeros((5, r))
    ones = 0.0
    for i in range(m):
        one = columns[i, 2 * r]
        ones += one * one
        for c in range(r):
            a, b = columns[i, c], columns[i, r + c]
            sums[0, c] += a * a
            sums[1, c] += a * b
            sums[2, c] += b * b
            sums[3, c] += a * one
            sums[4, c] += b * one
    for c in range(r):
        aa = sums[0, c] - sums[3, c] * sums[3, c] / ones
        ab = sums[1, c] - sums[3, c] * sums[4, c] / ones
        bb = sums[2, c] - sums[4, c] * sums[4, c] / ones
        out[c] = -log_det - 0.5 * (
            math.log(ones) + aa - ab * ab / (bb + stiffness) + math.log1p(bb / stiffness)
        )
    return out
