"""Products and triangular inverses of middling matrices, in one thread.

The linear algebra library shares matrices of some hundred rows among threads, which then wait for
one another and for whoever else uses the machine.
"""

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = ["inverse_factor", "product"]

Floats = NDArray[np.float64]


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract"})
def product(a: Floats, b: Floats) -> Floats:
    """Return ``a @ b.T`` of (p, n) and (q, n); four by four sums stay in registers at a time."""
    p, n = a.shape
    q = b.shape[0]
    out = np.empty((p, q))
    for i in range(0, p, 4):
        a0, a1 = a[i], a[min(i + 1, p - 1)]
        a2, a3 = a[min(i + 2, p - 1)], a[min(i + 3, p - 1)]
        for j in range(0, q, 4):
            b0, b1 = b[j], b[min(j + 1, q - 1)]
            b2, b3 = b[min(j + 2, q - 1)], b[min(j + 3, q - 1)]
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
                (t00, t01, t02, t03),
                (t10, t11, t12, t13),
                (t20, t21, t22, t23),
                (t30, t31, t32, t33),
            )
            for c in range(min(4, p - i)):
                one = found[c]
                for d in range(min(4, q - j)):
                    out[i + c, j + d] = one[d]
    return out


@njit(cache=True, nogil=True)
def inverse_factor(a: Floats) -> Floats:
    """Return ``L^-1`` of symmetric ``a = L L'``, L lower triangular; NaN if there is no such L."""
    m = a.shape[0]
    lower, inverse = a.copy(), np.zeros((m, m))
    for i in range(m):
        for j in range(i + 1):
            rest = lower[i, j]
            for k in range(j):
                rest -= lower[i, k] * lower[j, k]
            if i > j:
                lower[i, j] = rest / lower[j, j]
            elif rest > 0.0:
                lower[i, i] = math.sqrt(rest)
            else:
                inverse[:] = math.nan
                return inverse
        row = inverse[i]
        for k in range(i):
            factor, above = lower[i, k], inverse[k]
            for j in range(k + 1):
                row[j] -= factor * above[j]
        row[i] = 1.0
        for j in range(i + 1):
            row[j] /= lower[i, i]
    return inverse
