"""Log likelihood at trial lags of many simulated data sets that share their epochs.

Plain loops over tiles of four rows by four columns, which stay in the processor's registers. The
linear algebra library would share products of this size among threads, which costs more than it
saves and waits for whoever else uses the machine. Counts are padded to multiples of four: an epoch
too many has unit variance and knows of no other.
"""

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = ["log_likelihoods", "simulated_lines"]

Floats = NDArray[np.float64]
Indices = NDArray[np.int64]

_NOTHING = 1e-7
"""Share of the rms below which a whitened covariance counts as none: a continuum epoch says nothing
new about a response that those before it have settled."""


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract"})
def _add_tile(
    rows: Floats, i: int, j: int, a: Floats, b: Floats, ia: int, ib: int, n: int, sign: float
) -> None:
    """Add ``sign * a[ia:ia+4, :n] @ b[ib:ib+4, :n].T`` to ``rows[i:i+4, j:j+4]``."""
    a0, a1, a2, a3 = a[ia], a[ia + 1], a[ia + 2], a[ia + 3]
    b0, b1, b2, b3 = b[ib], b[ib + 1], b[ib + 2], b[ib + 3]
    t00, t01, t02, t03 = 0.0, 0.0, 0.0, 0.0
    t10, t11, t12, t13 = 0.0, 0.0, 0.0, 0.0
    t20, t21, t22, t23 = 0.0, 0.0, 0.0, 0.0
    t30, t31, t32, t33 = 0.0, 0.0, 0.0, 0.0
    for k in range(n):
        x0, x1, x2, x3 = a0[k], a1[k], a2[k], a3[k]
        y0, y1, y2, y3 = b0[k], b1[k], b2[k], b3[k]
        t00 += x0 * y0
        t01 += x0 * y1
        t02 += x0 * y2
        t03 += x0 * y3
        t10 += x1 * y0
        t11 += x1 * y1
        t12 += x1 * y2
        t13 += x1 * y3
        t20 += x2 * y0
        t21 += x2 * y1
        t22 += x2 * y2
        t23 += x2 * y3
        t30 += x3 * y0
        t31 += x3 * y1
        t32 += x3 * y2
        t33 += x3 * y3
    found = (
        (t00, t01, t02, t03), (t10, t11, t12, t13), (t20, t21, t22, t23), (t30, t31, t32, t33)
    )  # fmt: skip
    for p in range(4):
        row, one = rows[i + p], found[p]
        for q in range(4):
            row[j + q] += sign * one[q]


@njit(cache=True, nogil=True)
def _factor(rows: Floats) -> bool:
    """Factor the square top of `rows` after Cholesky, in place; False if it has no factor.

    Of the square only the lower triangle is read, and then holds the factor L; each further row x
    becomes ``L^-1 x``.
    """
    total, m = rows.shape
    for j in range(0, m, 4):
        for i in range(j, total, 4):
            _add_tile(rows, i, j, rows, rows, i, j, j, -1.0)
        for c in range(j, j + 4):
            for d in range(j, c + 1):
                rest = rows[c, d]
                for k in range(j, d):
                    rest -= rows[c, k] * rows[d, k]
                if d < c:
                    rows[c, d] = rest / rows[d, d]
                elif rest > 0.0:
                    rows[c, c] = math.sqrt(rest)
                else:
                    return False
        p0, p1 = 1.0 / rows[j, j], 1.0 / rows[j + 1, j + 1]
        p2, p3 = 1.0 / rows[j + 2, j + 2], 1.0 / rows[j + 3, j + 3]
        l10, l20, l30 = rows[j + 1, j], rows[j + 2, j], rows[j + 3, j]
        l21, l31, l32 = rows[j + 2, j + 1], rows[j + 3, j + 1], rows[j + 3, j + 2]
        for i in range(j + 4, total):
            row = rows[i]
            x0 = row[j] * p0
            x1 = (row[j + 1] - x0 * l10) * p1
            x2 = (row[j + 2] - x0 * l20 - x1 * l21) * p2
            row[j], row[j + 1], row[j + 2] = x0, x1, x2
            row[j + 3] = (row[j + 3] - x0 * l30 - x1 * l31 - x2 * l32) * p3
    return True


@njit(cache=True, nogil=True)
def _whiten(
    factor: tuple[Floats, Floats, Floats], basis: Floats, cross: Floats, rms: float, white: Floats
) -> tuple[Floats, Indices]:
    """Write ``rms * whitened(cross)``, transposed, to `white`; of this the rows beyond m stay.

    Returns its products with `basis` and, for each four rows, how many columns are not nothing.
    """
    decay, gain, spread = factor
    n, m = cross.shape
    forecast = np.zeros(m)
    along = np.zeros((basis.shape[0], m))
    one = np.empty(m)
    for k in range(n):
        a, g, s, row = decay[k], gain[k], rms / spread[k], cross[k]
        for i in range(m):
            before = a * forecast[i]
            miss = row[i] - before
            one[i] = miss * s
            forecast[i] = before + g * miss
        for p in range(basis.shape[0]):
            u = basis[p, k]
            for i in range(m):
                along[p, i] += u * one[i]
        for i in range(m):
            white[i, k] = one[i]
    used = np.zeros(white.shape[0] // 4, dtype=np.int64)
    for i in range(m):
        k = n
        while k > used[i // 4] and abs(white[i, k - 1]) < _NOTHING * rms:
            k -= 1
        used[i // 4] = max(used[i // 4], k)
    return along, used


@njit(cache=True, nogil=True)
def _covariance(
    rows: Floats,
    white: Floats,
    along: Floats,
    used: Indices,
    line: Floats,
    err2: Floats,
    rms: float,
) -> None:
    """Write the lower triangle of the line's covariance given the continuum to `rows`."""
    m = err2.size
    for i in range(m):
        for j in range(i + 1):
            value = rms * rms * line[i, j]
            for p in range(along.shape[0]):
                value += along[p, i] * along[p, j]
            rows[i, j] = value
        rows[i, i] += err2[i] * err2[i]
    padded = rows.shape[1]
    for i in range(m, padded):
        rows[i] = 0.0
        rows[i, i] = 1.0
    for i in range(0, padded, 4):
        for j in range(0, i + 4, 4):
            _add_tile(rows, i, j, white, white, i, j, min(used[i // 4], used[j // 4]), -1.0)


@njit(cache=True, nogil=True)
def simulated_lines(
    factor: tuple[Floats, Floats, Floats],
    basis: Floats,
    cross: Floats,
    line: Floats,
    err2: Floats,
    rms: float,
    normals1: Floats,
    normals2: Floats,
) -> Floats:
    """Return lines drawn given their continua, (r, m); NaN if the covariance is no covariance.

    Arguments as for `log_likelihoods`, but for ``cross`` (n, m), ``line`` (m, m) at the true lag
    and ``normals2`` (r, m), standard normals.
    """
    r, m = normals2.shape
    padded = (m + 3) // 4 * 4
    white = np.zeros((padded, cross.shape[0]))
    along, used = _whiten(factor, basis, cross, rms, white)
    rows = np.zeros((padded, padded))
    _covariance(rows, white, along, used, line, err2, rms)
    out = np.full((r, m), math.nan)
    if not _factor(rows):
        return out
    for c in range(r):
        for i in range(m):
            value = 0.0
            for k in range(i + 1):
                value += rows[i, k] * normals2[c, k]
            for k in range(cross.shape[0]):
                value += white[i, k] * normals1[c, k]
            out[c, i] = value
    return out


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract"})
def _density(data: Floats, mean: Floats, unit: Floats, stiffness: float) -> float:
    """Return the log density of whitened data, scale and offset integrated out, but for |L|."""
    aa, ab, bb, a1, b1, ones = 0.0, 0.0, 0.0, 0.0, 0.0, 0.0
    for i in range(data.size):
        b, u = mean[i], unit[i]
        a = data[i] - b
        aa += a * a
        ab += a * b
        bb += b * b
        a1 += a * u
        b1 += b * u
        ones += u * u
    aa -= a1 * a1 / ones
    ab -= a1 * b1 / ones
    bb -= b1 * b1 / ones
    rest = aa - ab * ab / (bb + stiffness)
    return -0.5 * (math.log(ones) + rest + math.log1p(bb / stiffness))


@njit(cache=True, nogil=True)
def log_likelihoods(
    factor: tuple[Floats, Floats, Floats],
    basis: Floats,
    cross: Floats,
    line: Floats,
    err2: Floats,
    rms: float,
    normals1: Floats,
    lines: Floats,
    stiffness: float,
) -> Floats:
    """Return ln p(line | continuum), constants left out, at each trial lag, (k, r).

    Parameters
    ----------
    factor : three float64 (n,)
        Decay, gain and spread of the continuum's factor.
    basis : float64 (p, n)
        Whitened offsets of the continuum, orthonormal.
    cross, line : float64 (k, n, m), (k, m, m)
        Unit covariances of continuum and response, and of the response, at each trial lag.
    err2 : float64 (m,)
        Errors of the line.
    rms : float
        Rms of the line's driver in the line's unit.
    normals1 : float64 (r, n)
        Whitened continua of the data sets, free of the offsets.
    lines : float64 (r, m)
        Their lines.
    stiffness : float
        One over the prior variance of ln scale, to which the mean answers linearly. The offset is
        integrated out.
    """
    r, m = lines.shape
    n = cross.shape[1]
    padded, many = (m + 3) // 4 * 4, (r + 3) // 4 * 4
    drivers = np.zeros((many, n))
    drivers[:r] = normals1
    white = np.zeros((padded, n))
    rows = np.zeros((padded + 2 * many + 4, padded))
    data, mean, one = padded, padded + many, padded + 2 * many
    out = np.empty((cross.shape[0], r))
    for lag in range(cross.shape[0]):
        along, used = _whiten(factor, basis, cross[lag], rms, white)
        _covariance(rows, white, along, used, line[lag], err2, rms)
        rows[data:] = 0.0
        rows[data : data + r, :m] = lines
        rows[one, :m] = 1.0
        for i in range(0, many, 4):
            for j in range(0, padded, 4):
                _add_tile(rows, mean + i, j, drivers, white, i, j, used[j // 4], 1.0)
        if not _factor(rows):
            out[lag] = -math.inf
            continue
        log_det = 0.0
        for i in range(m):
            log_det += math.log(rows[i, i])
        for c in range(r):
            found = _density(rows[data + c], rows[mean + c], rows[one], stiffness)
            out[lag, c] = found - log_det
    return out
