"""Responses of the line on an even grid of delays."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["longest_delay", "response_weights"]

Floats = NDArray[np.float64]

_TAIL_LAGS = 12.0
"""Where the long tail is cut; 1e-9 of it lies beyond."""


def longest_delay(response: str, lag_d: float, width_d: float) -> float:
    """Return the delay beyond which nothing answers; arguments as in `response_weights`."""
    if response == "long tail":
        return _TAIL_LAGS * lag_d
    return lag_d + (lag_d if response == "shell" else 0.5 * width_d)


def response_weights(response: str, lag_d: float, width_d: float, step_d: float) -> Floats:
    """Return the weights of the driver at delays 0, step, 2 step, ... in the line.

    They are those of the response integrated over a driver that is straight between the grid's
    nodes, hence second differences of the response's double integral. Their sum is 1 and their
    mean delay the lag, whatever the step.

    Parameters
    ----------
    response : str
        ``top hat``: uniform, full width `width_d`, centred on the lag; ``shell``: uniform from 0
        to twice the lag (thin spherical shell that emits alike in all directions); ``long tail``:
        ``4 s exp(-2 s / lag) / lag^2`` at delay s, the gamma density of shape 2.
    lag_d : float
        Mean delay, > 0.
    width_d : float
        Used by ``top hat`` alone; at most twice the lag, 0 for a sharp response.
    step_d : float

    Returns
    -------
    array (k,)

    Raises
    ------
    ValueError
        If the response is unknown or would answer before it is driven.
    """
    if response not in ("top hat", "shell", "long tail"):
        raise ValueError(f"no response is called {response!r}")
    if not lag_d > 0.0 or not 0.0 <= width_d <= 2.0 * lag_d:
        raise ValueError(f"need lag_d > 0 and 0 <= width_d <= 2 lag_d, got {lag_d} and {width_d}")
    count = int(np.ceil(longest_delay(response, lag_d, width_d) / step_d)) + 1
    delay: Floats = step_d * np.arange(-1.0, count + 1.0)
    if response == "long tail":
        double = _double_integral_of_tail(np.maximum(delay, 0.0), 0.5 * lag_d)
    else:
        width_d = 2.0 * lag_d if response == "shell" else width_d
        double = _double_integral_of_top_hat(delay, lag_d, width_d)
    return np.asarray(np.diff(double, n=2) / step_d)


def _double_integral_of_tail(delay: Floats, scale: float) -> Floats:
    return np.asarray(delay - 2.0 * scale + (delay + 2.0 * scale) * np.exp(-delay / scale))


def _double_integral_of_top_hat(delay: Floats, lag: float, width: float) -> Floats:
    """0 before the top hat, straight after it, a parabola in it."""
    inside = np.clip(delay - (lag - 0.5 * width), 0.0, width)
    beyond = np.maximum(delay - (lag + 0.5 * width), 0.0)
    # Mean of the ramp over the width: inside * (inside / width) / 2, which is 0 for width 0.
    share = inside / width if width > 0.0 else np.zeros_like(delay)
    return np.asarray(0.5 * inside * share + beyond)
