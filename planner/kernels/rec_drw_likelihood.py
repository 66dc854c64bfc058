"""Likelihood of a damped random walk seen with noise, by one pass along the light curve."""

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = ["drw_filter"]

Floats = NDArray[np.float64]


@njit(cache=True, nogil=True)
def drw_filter(
    t_d: Floats, y: Floats, err: Floats, sigma: float, tau_d: float
) -> tuple[float, float, float, float]:
    """Return (log det C, y' C^-1 y, y' C^-1 1, 1' C^-1 1) for C = walk + noise.

    Kalman recursion for ``C_ij = sigma^2 exp(-|t_i - t_j| / tau) + err_i^2 [i = j]``, of the
    data and, with the same gains, of a constant.

    Parameters
    ----------
    t_d, y, err : float64 (n,)
        Times ascending (ties allowed), values, one-sigma errors.
    sigma : float
        Asymptotic rms of the walk, in the unit of `y`.
    tau_d : float
        Damping timescale, > 0.

    Returns
    -------
    tuple of 4 floats
        ``log det C`` is -inf where C is singular (two noiseless points at one time, say); the
        others then mean nothing.
    """
    log_det, yy, y1, ones = 0.0, 0.0, 0.0, 0.0
    state_y, state_1, variance = 0.0, 0.0, sigma * sigma
    for i in range(t_d.size):
        if i > 0:
            dt = t_d[i] - t_d[i - 1]
            a = math.exp(-dt / tau_d)
            state_y *= a
            state_1 *= a
            variance = a * a * variance - sigma * sigma * math.expm1(-2.0 * dt / tau_d)
        total = variance + err[i] * err[i]
        if total <= 0.0:
            return -math.inf, 0.0, 0.0, 0.0
        miss_y, miss_1 = y[i] - state_y, 1.0 - state_1
        log_det += math.log(total)
        yy += miss_y * miss_y / total
        y1 += miss_y * miss_1 / total
        ones += miss_1 * miss_1 / total
        gain = variance / total
        state_y += gain * miss_y
        state_1 += gain * miss_1
        variance = err[i] * err[i] * gain
    return log_det, yy, y1, ones
