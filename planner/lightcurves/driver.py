"""The varying continuum and the line that answers it, drawn jointly at any epochs."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.kernels.ou_process import ou_path

__all__ = ["draw_pair"]

Floats = NDArray[np.float64]


def draw_pair(
    rng: np.random.Generator,
    t_continuum_d: Floats,
    t_line_d: Floats,
    tau_d: float,
    lag_d: float,
    width_d: float,
) -> tuple[Floats, Floats]:
    """Draw the unit driver at the continuum's epochs and its delayed response at the line's.

    The driver x is a stationary damped random walk of zero mean and unit variance (Kelly et al.
    2009, ApJ 698, 895; sampled as in MacLeod et al. 2010, ApJ 721, 1014, eq. 5). The response is
    a top hat of full width w centred on the lag:
    ``y(t) = (1/w) * integral of x from t - lag - w/2 to t - lag + w/2``; for w = 0,
    ``y(t) = x(t - lag)``. Walk and running integral are stepped together from their exact joint
    distribution, so there is no time grid and no step-size error.

    Parameters
    ----------
    rng : numpy.random.Generator
        Stream of this trial's variability.
    t_continuum_d : array (n,)
        Epochs, any order, ties allowed; days, observed frame.
    t_line_d : array (m,)
        The same for the line.
    tau_d : float
        Damping timescale, observed frame, > 0.
    lag_d : float
        Mean delay of the response, observed frame.
    width_d : float
        Full width of the response, observed frame, >= 0. A width below a millionth of a day is
        limited by rounding of the integral; use 0 for a sharp response.

    Returns
    -------
    x_continuum : array (n,)
    y_line : array (m,)

    Raises
    ------
    ValueError
        If the timescale is not positive or the width is negative.
    """
    if not tau_d > 0.0 or not width_d >= 0.0:
        raise ValueError(f"need tau_d > 0 and width_d >= 0, got {tau_d} and {width_d}")
    centre = np.asarray(t_line_d, dtype=np.float64) - lag_d
    edges = [centre - 0.5 * width_d, centre + 0.5 * width_d] if width_d > 0.0 else [centre]
    t = np.concatenate([np.asarray(t_continuum_d, dtype=np.float64), *edges])
    order = np.argsort(t, kind="stable")
    x, integral = ou_path(t[order], float(tau_d), rng.standard_normal((t.size, 2)))
    place = np.empty_like(order)
    place[order] = np.arange(order.size)
    n, m = t.size - len(edges) * centre.size, centre.size
    x_continuum = x[place[:n]]
    if width_d == 0.0:
        return x_continuum, x[place[n:]]
    early, late = place[n : n + m], place[n + m :]
    return x_continuum, (integral[late] - integral[early]) / (t[n + m :] - t[n : n + m])
