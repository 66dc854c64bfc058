"""Covariances of a unit damped random walk with its delayed and smeared response.

The response has unit area and its mean at the lag. Shapes: 0 top hat of full width `width`, 1
Gaussian of standard deviation `width`, 2 ring (delays ``lag + width cos(phi)``, phi uniform).
Beyond a shape's reach every covariance is exactly its amplitude times ``exp(-|d| / tau)``, so
that one exponential serves a whole run of epochs.
"""

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = ["cross_covariance", "line_covariance"]

Floats = NDArray[np.float64]
Indices = NDArray[np.int64]

_ABSCISSA, _WEIGHT = np.polynomial.legendre.leggauss(24)
_SMOOTH = 0.05
"""Width over timescale above which a top hat's plain exponentials do not cancel noticeably."""
_FAR = 9.0
"""Standard deviations beyond which a Gaussian's covariance is exponential to rounding."""


@njit(cache=True, nogil=True)
def _ramp(u: float) -> float:
    """Return exp(-u) - 1 + u without cancellation."""
    if u > 0.3:
        return math.exp(-u) - 1.0 + u
    term, total = 0.5 * u * u, 0.0
    for k in range(3, 16):
        total += term
        term *= -u / k
    return total


@njit(cache=True, nogil=True)
def _scaled_erfc(z: float) -> float:
    """Return exp(z^2) erfc(z) for z >= 0; beyond 8 by its asymptotic series."""
    if z < 8.0:
        return math.exp(z * z) * math.erfc(z)
    term, total = 1.0, 0.0
    for k in range(12):
        total += term
        term *= -(2 * k + 1) / (2.0 * z * z)
    return total / (z * math.sqrt(math.pi))


@njit(cache=True, nogil=True)
def _tail(d: float, width: float, tau: float) -> float:
    """Return one half of the Gaussian's covariance, with exp(-d / tau) in it."""
    z = (width / tau - d / width) / math.sqrt(2.0)
    if z > 0.0:
        return 0.5 * math.exp(-0.5 * (d / width) ** 2) * _scaled_erfc(z)
    return 0.5 * math.exp(0.5 * (width / tau) ** 2 - d / tau) * math.erfc(z)


@njit(cache=True, nogil=True)
def _log_bessel(x: float) -> float:
    """Return ln I0(x): its series below 30, its asymptotic series above."""
    total, term = 1.0, 1.0
    if x < 30.0:
        for k in range(1, 80):
            term *= (0.5 * x / k) ** 2
            total += term
            if term < 1e-17 * total:
                break
        return math.log(total)
    for k in range(1, 16):
        term *= (2 * k - 1) ** 2 / (8.0 * k * x)
        total += term
    return x + math.log(total / math.sqrt(2.0 * math.pi * x))


@njit(cache=True, nogil=True)
def _ring(d: float, radius: float, tau: float) -> float:
    """Return the mean of exp(-|d - radius cos(phi)| / tau): quadrature split at the kink."""
    d = abs(d)
    if d >= radius:
        return math.exp(_log_bessel(radius / tau) - d / tau)
    kink, total = math.acos(d / radius), 0.0
    for k in range(_ABSCISSA.size):
        near = 0.5 * kink * (1.0 + _ABSCISSA[k])
        far = kink + 0.5 * (math.pi - kink) * (1.0 + _ABSCISSA[k])
        total += _WEIGHT[k] * kink * math.exp((d - radius * math.cos(near)) / tau)
        total += _WEIGHT[k] * (math.pi - kink) * math.exp((radius * math.cos(far) - d) / tau)
    return 0.5 * total / math.pi


@njit(cache=True, nogil=True)
def _ring_twice(d: float, radius: float, tau: float) -> float:
    """Return the ring's covariance with itself.

    ``cos(a) - cos(b) = -2 sin((a+b)/2) sin((a-b)/2)``: a ring of radius ``2 radius sin(s)``,
    averaged over s in 0..pi/2. The integrand goes as a power 3/2 from its kink on, hence the
    square in the variable there.
    """
    d = abs(d)
    kink = math.asin(min(1.0, 0.5 * d / radius))
    rest, total = math.sqrt(0.5 * math.pi - kink), 0.0
    for k in range(_ABSCISSA.size):
        half = 0.5 * (1.0 + _ABSCISSA[k])
        wide = 2.0 * radius * math.sin(kink * half)
        total += 0.5 * _WEIGHT[k] * kink * math.exp(_log_bessel(wide / tau) - d / tau)
        root = rest * half
        wide = 2.0 * radius * math.sin(kink + root * root)
        total += _WEIGHT[k] * rest * root * _ring(d, wide, tau)
    return 2.0 * total / math.pi


@njit(cache=True, nogil=True)
def _reach(shape: int, width: float, tau: float) -> tuple[float, float]:
    """Return (distance beyond which the cross-covariance is exponential, ln of its amplitude)."""
    if width == 0.0:
        return 0.0, 0.0
    if shape == 0:
        a = 0.5 * width / tau
        return 0.5 * width, a + math.log(-math.expm1(-2.0 * a) / (2.0 * a))
    if shape == 1:
        return width * (width / tau + _FAR), 0.5 * (width / tau) ** 2
    return width, _log_bessel(width / tau)


@njit(cache=True, nogil=True)
def _cross(shape: int, d: float, width: float, tau: float) -> float:
    """Return the cross-covariance within reach."""
    if shape == 0:
        early, late = (0.5 * width + d) / tau, (0.5 * width - d) / tau
        return -(math.expm1(-early) + math.expm1(-late)) * tau / width
    if shape == 1:
        return _tail(d, width, tau) + _tail(-d, width, tau)
    return _ring(d, width, tau)


@njit(cache=True, nogil=True)
def _line(shape: int, d: float, width: float, tau: float) -> float:
    """Return the line's own covariance within twice the reach, d >= 0."""
    if shape == 0:
        u, a = d / tau, width / tau
        return (_ramp(a + u) + _ramp(a - u) - 2.0 * _ramp(u)) / (a * a)
    if shape == 1:
        wide = math.sqrt(2.0) * width
        return _tail(d, wide, tau) + _tail(-d, wide, tau)
    return _ring_twice(d, width, tau)


@njit(cache=True, nogil=True)
def _spread(block: Floats, decay: Floats, firsts: Indices, lasts: Indices) -> None:
    """Fill a block outward from the epochs next to each response, row by row.

    `firsts` and `lasts` never decrease, so that in each row the columns to be filled from below
    are the last ones, those from above the first ones. Values are flushed to zero before they
    become denormal, which is slow.
    """
    n, m = block.shape
    begin = m
    for j in range(n - 2, -1, -1):
        while begin > 0 and firsts[begin - 1] - 1 > j:
            begin -= 1
        row, near, a = block[j], block[j + 1], decay[j + 1]
        for i in range(begin, m):
            value = near[i] * a
            row[i] = value if value > 1e-200 else 0.0
    end = 0
    for j in range(1, n):
        while end < m and lasts[end] < j:
            end += 1
        row, near, a = block[j], block[j - 1], decay[j]
        for i in range(end):
            value = near[i] * a
            row[i] = value if value > 1e-200 else 0.0


@njit(cache=True, nogil=True)
def cross_covariance(
    shape: int, t1_d: Floats, t2_d: Floats, lags_d: Floats, widths_d: Floats, tau_d: float
) -> Floats:
    """Return the covariance of the walk at `t1_d` with its response at `t2_d`, for each lag.

    Parameters
    ----------
    shape : int
        0 top hat, 1 Gaussian, 2 ring.
    t1_d, t2_d : float64 (n,), (m,)
        Times, ascending.
    lags_d, widths_d : float64 (k,)
        Mean delay and width, width >= 0.
    tau_d : float

    Returns
    -------
    float64 (k, n, m)
    """
    n, m = t1_d.size, t2_d.size
    out = np.empty((lags_d.size, n, m))
    decay = np.zeros(n)
    for j in range(1, n):
        decay[j] = math.exp((t1_d[j - 1] - t1_d[j]) / tau_d)
    firsts, lasts = np.empty(m, dtype=np.int64), np.empty(m, dtype=np.int64)
    for k in range(lags_d.size):
        width = widths_d[k]
        reach, log_amplitude = _reach(shape, width, tau_d)
        for i in range(m):
            centre = t2_d[i] - lags_d[k]
            first = np.searchsorted(t1_d, centre - reach, side="right")
            last = max(first, np.searchsorted(t1_d, centre + reach, side="left"))
            if shape == 0 and first < last and width > _SMOOTH * tau_d:
                early = math.exp((t1_d[last - 1] - centre - reach) / tau_d)
                late = math.exp((centre - reach - t1_d[first]) / tau_d)
                for j in range(first, last):
                    out[k, j, i] = (2.0 - late) * tau_d / width
                    if j + 1 < last:
                        late *= decay[j + 1]
                for j in range(last - 1, first - 1, -1):
                    out[k, j, i] -= early * tau_d / width
                    early *= decay[j]
            else:
                for j in range(first, last):
                    out[k, j, i] = _cross(shape, centre - t1_d[j], width, tau_d)
            if first > 0:
                out[k, first - 1, i] = math.exp(log_amplitude - (centre - t1_d[first - 1]) / tau_d)
            if last < n:
                out[k, last, i] = math.exp(log_amplitude - (t1_d[last] - centre) / tau_d)
            firsts[i], lasts[i] = first, last
        _spread(out[k], decay, firsts, lasts)
    return out


@njit(cache=True, nogil=True)
def line_covariance(shape: int, t2_d: Floats, widths_d: Floats, tau_d: float) -> Floats:
    """Return the covariance of the response with itself, (k, m, m), for each width."""
    m = t2_d.size
    out = np.empty((widths_d.size, m, m))
    decay = np.empty(m)
    for j in range(1, m):
        decay[j] = math.exp((t2_d[j - 1] - t2_d[j]) / tau_d)
    for k in range(widths_d.size):
        width = widths_d[k]
        if shape == 1:
            reach, log_amplitude = _reach(shape, math.sqrt(2.0) * width, tau_d)
        else:
            reach, log_amplitude = _reach(shape, width, tau_d)
            reach, log_amplitude = 2.0 * reach, 2.0 * log_amplitude
        own = _line(shape, 0.0, width, tau_d) if width > 0.0 else 1.0
        a = width / tau_d
        short = math.exp(-a)
        for i in range(m):
            out[k, i, i] = own
            value, fall = -1.0, 1.0
            for j in range(i + 1, m):
                d = t2_d[j] - t2_d[i]
                fall *= decay[j]
                if d < reach and shape == 0 and a > _SMOOTH:
                    inside = short * (fall + 1.0 / fall) - 2.0 * fall
                    out[k, i, j] = (inside + 2.0 * (reach - d) / tau_d) / (a * a)
                elif d < reach:
                    out[k, i, j] = _line(shape, d, width, tau_d)
                else:
                    if value < 0.0:
                        value = math.exp(log_amplitude - d / tau_d)
                    else:
                        value = value * decay[j] if value > 1e-200 else 0.0
                    out[k, i, j] = value
                out[k, j, i] = out[k, i, j]
    return out
