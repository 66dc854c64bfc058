"""Exact likelihood of one light curve under a damped random walk."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from planner.kernels.rec_drw_likelihood import drw_filter

__all__ = ["drw_log_likelihood"]


def drw_log_likelihood(
    t_d: ArrayLike,
    flux: ArrayLike,
    error: ArrayLike,
    sigma: float,
    tau_d: float,
    mean: float | None = 0.0,
) -> float:
    """Return the log likelihood of a light curve as a damped random walk with noise.

    Covariance ``sigma^2 exp(-|dt| / tau)`` plus the errors squared (Kelly et al. 2009, ApJ 698,
    895), evaluated exactly in one pass, O(n).

    Parameters
    ----------
    t_d, flux : array (n,)
        Any order; times may repeat. Days, observed frame.
    error : array (n,) or float
        One-sigma errors, in the unit of `flux`.
    sigma : float
        Asymptotic rms of the walk, > 0, in the unit of `flux`.
    tau_d : float
        Damping timescale, > 0, observed frame.
    mean : float or None
        Known mean; None: unknown, integrated out under a flat prior, because a mean fixed at the
        sample's makes the timescale over-confident.

    Returns
    -------
    float
        Natural logarithm; -inf where the covariance is singular. With a free mean the value has
        the flat prior's density of 1 per unit of flux in it.

    Raises
    ------
    ValueError
        If `sigma` or `tau_d` is not positive.
    """
    if not sigma > 0.0 or not tau_d > 0.0:
        raise ValueError(f"need sigma > 0 and tau_d > 0, got {sigma} and {tau_d}")
    t, y, e = np.broadcast_arrays(
        *(np.atleast_1d(np.asarray(a, dtype=np.float64)) for a in (t_d, flux, error))
    )
    order = np.argsort(t, kind="stable")
    shifted = y[order] - (0.0 if mean is None else mean)
    log_det, yy, y1, ones = drw_filter(t[order], shifted, e[order], float(sigma), float(tau_d))
    if log_det == -math.inf:
        return -math.inf
    known = -0.5 * (yy + log_det + t.size * math.log(2.0 * math.pi))
    if mean is not None:
        return float(known)
    return float(known + 0.5 * (y1 * y1 / ones + math.log(2.0 * math.pi / ones)))
