"""A driver whose power spectrum bends from flat to any slope, by Fourier synthesis."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray
from scipy.fft import irfft, next_fast_len, rfftfreq

__all__ = ["MEMORY", "power_law_path"]

Floats = NDArray[np.float64]

MEMORY = 10.0
"""Timescales by which the synthesis' period exceeds the path, since what is synthesised repeats
itself. For a slope of 3 the covariance falls to ``-(36 sin(pi/3) / 2 pi) (tau / t)^4``, here
5e-4."""


def power_law_path(
    rng: np.random.Generator, count: int, step_d: float, tau_d: float, slope: float
) -> Floats:
    """Draw a Gaussian path of zero mean and unit variance on an even grid.

    Its two-sided power spectrum is ``slope tau sin(pi / slope) / (1 + (2 pi f tau)^slope)``, which
    integrates to 1: flat below the break at ``1 / (2 pi tau)``, ``f^-slope`` above; slope 2 is
    the damped random walk. Each frequency has Gaussian real and imaginary parts of its own
    (Timmer & Koenig 1995, A&A 300, 707). What lies beyond the grid's highest frequency is left
    out: of the variance ``slope sin(pi / slope) / (pi (slope - 1)) (step / pi tau)^(slope - 1)``.

    Parameters
    ----------
    rng : numpy.random.Generator
    count : int
        Nodes wanted, > 0.
    step_d, tau_d : float
        Step of the grid and timescale of the break, > 0, one frame.
    slope : float
        > 1.

    Returns
    -------
    array (count,)

    Raises
    ------
    ValueError
        If the slope is not above 1: the variance would be infinite.
    """
    if not slope > 1.0:
        raise ValueError(f"need slope > 1, got {slope}")
    period = next_fast_len(count + math.ceil(MEMORY * tau_d / step_d), real=True)
    frequency = rfftfreq(period, step_d)
    power = slope * tau_d * math.sin(math.pi / slope)
    power = power / (1.0 + (2.0 * math.pi * tau_d * frequency) ** slope)
    parts = rng.standard_normal((2, frequency.size))
    modes = np.sqrt(0.5 * power / (period * step_d)) * (parts[0] + 1j * parts[1])
    # The mean, and with an even period the last frequency, are real and stand once, not twice.
    real = [0, -1] if period % 2 == 0 else [0]
    modes[real] = math.sqrt(2.0) * modes[real].real
    return np.asarray(irfft(modes, period, norm="forward")[:count])
