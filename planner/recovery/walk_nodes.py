"""The walk's timescale and rms as the continuum alone knows them, in a few nodes."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from planner.recovery.joint import Factor, Pair, continuum_factor

__all__ = ["walk_nodes"]

Floats = NDArray[np.float64]

_REACH = 2.4
"""Standard deviations of the prior of ln tau that are looked at."""


def walk_nodes(
    pair: Pair, sigma: float, sigma_dex: float, tau_d: float, tau_dex: float
) -> list[tuple[float, Factor]]:
    """Return weights and factored continua that stand for the walk's posterior given it.

    The prior is log-normal in both parameters. At each of nine timescales the rms is integrated
    out by Laplace's method; the mean and spread of ln tau that result set the three nodes of
    Gauss-Hermite quadrature, each with the best rms at that timescale: at fixed timescale the
    continuum knows its rms to a few per cent, along sigma^2 / tau = constant hardly at all.

    Parameters
    ----------
    pair : Pair
    sigma, tau_d : float
        Medians of the priors.
    sigma_dex, tau_dex : float
        Their scatters; 0: known.
    """
    spread, reach = sigma_dex * math.log(10.0), tau_dex * math.log(10.0)
    if reach == 0.0:
        log_sigma, _ = _over_sigma(pair, math.log(sigma), spread, tau_d)
        return [(1.0, continuum_factor(pair, math.exp(log_sigma), tau_d))]
    steps = np.linspace(-_REACH, _REACH, 9)
    x = math.log(tau_d) + reach * steps
    best, value = np.empty(9), np.empty(9)
    for k in (4, 5, 6, 7, 8, 3, 2, 1, 0):
        near = None if k == 4 else float(best[k - 1 if k > 4 else k + 1])
        best[k], value[k] = _over_sigma(pair, math.log(sigma), spread, math.exp(x[k]), near)
    fine = np.linspace(x[0], x[-1], 81)
    log_weight = np.interp(fine, x, value) - 0.5 * ((fine - math.log(tau_d)) / reach) ** 2
    weight = np.exp(log_weight - log_weight.max())
    weight /= weight.sum()
    mean = float(weight @ fine)
    width = math.sqrt(float(weight @ (fine - mean) ** 2))
    nodes = []
    for share, at in ((1 / 6, -math.sqrt(3.0)), (2 / 3, 0.0), (1 / 6, math.sqrt(3.0))):
        where = mean + at * width
        rms = math.exp(float(np.interp(where, x, best)))
        nodes.append((share, continuum_factor(pair, rms, math.exp(where))))
    return nodes


def _over_sigma(
    pair: Pair, prior: float, spread: float, tau_d: float, start: float | None = None
) -> tuple[float, float]:
    """Return the best ln sigma and the log likelihood integrated over its prior."""
    if spread == 0.0:
        return prior, continuum_factor(pair, math.exp(prior), tau_d).log_likelihood

    def value(x: float) -> float:
        known = continuum_factor(pair, math.exp(x), tau_d).log_likelihood
        return known - 0.5 * ((x - prior) / spread) ** 2

    x, h = (prior if start is None else start), 0.1
    bend = 1.0 / spread**2
    for _ in range(8):
        low, middle, high = value(x - h), value(x), value(x + h)
        bend = max((2.0 * middle - low - high) / h**2, 1.0 / spread**2)
        move = min(max(0.5 * (high - low) / h / bend, -1.0), 1.0)
        x += move
        if abs(move) < 0.02:
            break
    return x, middle + 0.5 * bend * move**2 - 0.5 * math.log(bend * spread**2)
