"""A damped random walk and its running integral, sampled exactly at any times."""

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = ["integral_variance", "ou_path"]

Floats = NDArray[np.float64]


@njit(cache=True, nogil=True)
def integral_variance(u: float) -> float:
    """Return Var(integral of x over a step | x at its start) / tau^2 for a step of u = dt / tau.

    ``2u - 3 + 4 exp(-u) - exp(-2u)``; by its series, sum of (-u)^k (4 - 2^k) / k! from k = 3,
    where that would cancel.
    """
    if u > 0.3:
        m = -math.expm1(-u)
        return 2.0 * (u - m) - m * m
    total, power, two = 0.0, -u * u * u / 6.0, 8.0
    for k in range(4, 16):
        total += power * (4.0 - two)
        power *= -u / k
        two *= 2.0
    return total


@njit(cache=True, nogil=True)
def ou_path(t_d: Floats, tau_d: float, normals: Floats) -> tuple[Floats, Floats]:
    """Return (x, integral of x since the first time) of a unit-variance damped random walk.

    x and its integral together are a Gaussian Markov process, so each step draws the pair from
    its exact joint distribution given x at the step's start: no grid, no step-size error.

    Parameters
    ----------
    t_d : float64 (n,)
        Times, ascending; equal times give equal values.
    tau_d : float
        Damping timescale, > 0, in the unit of `t_d`.
    normals : float64 (n, 2)
        Standard normal deviates.

    Returns
    -------
    x, integral : float64 (n,)
        `integral` in units of x times the unit of `t_d`.
    """
    x = np.empty(t_d.size)
    integral = np.empty(t_d.size)
    if t_d.size == 0:
        return x, integral
    x[0] = normals[0, 0]
    integral[0] = 0.0
    for i in range(1, t_d.size):
        u = (t_d[i] - t_d[i - 1]) / tau_d
        m = -math.expm1(-u)
        # Var(x) = m(2-m), Cov(x, integral) = tau m^2; what is left of the integral's variance
        # once x at the step's end is known follows from the two.
        spread = math.sqrt(m * (2.0 - m))
        shared = m * math.sqrt(m / (2.0 - m))
        rest = math.sqrt(max(integral_variance(u) - shared * shared, 0.0))
        z = normals[i, 0]
        x[i] = x[i - 1] - m * x[i - 1] + spread * z
        step = m * x[i - 1] + shared * z + rest * normals[i, 1]
        integral[i] = integral[i - 1] + tau_d * step
    return x, integral
