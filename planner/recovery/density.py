"""A density on an uneven grid: normalisation, quantiles, peaks and their shares."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

__all__ = ["Alias", "log_integral", "normalised", "peaks", "quantiles"]

Floats = NDArray[np.float64]

DIP = 0.5
"""A minimum parts two peaks if it lies below this share of the lower one; our choice."""


@dataclass(frozen=True, slots=True)
class Alias:
    """One peak of a lag's posterior density."""

    lag_d: float
    share: float
    """Probability between the minima on either side."""


def log_integral(x: Floats, log_density: Floats) -> float:
    """Return ln of the integral of a density given by its logarithm, (k,) on ascending `x`."""
    top = float(log_density.max())
    if not np.isfinite(top):
        return -np.inf
    return top + float(np.log(np.trapezoid(np.exp(log_density - top), x)))


def normalised(x: Floats, log_density: Floats) -> Floats:
    """Return the density, of unit area by the trapezoidal rule."""
    density = np.exp(log_density - log_density.max())
    return np.asarray(density / np.trapezoid(density, x))


def quantiles(x: Floats, density: Floats, probabilities: Floats) -> Floats:
    """Return quantiles of a density that is linear between the grid's points."""
    step, left = np.diff(x), density[:-1]
    mass = 0.5 * step * (left + density[1:])
    below = np.concatenate([[0.0], np.cumsum(mass)])
    wanted = probabilities * below[-1]
    k = np.clip(np.searchsorted(below, wanted, side="right") - 1, 0, step.size - 1)
    rest, slope = wanted - below[k], (density[k + 1] - left[k]) / step[k]
    # The root of slope u^2 / 2 + left u = rest in the form that does not cancel.
    root = np.sqrt(np.maximum(left[k] ** 2 + 2.0 * slope * rest, 0.0)) + left[k]
    into = np.divide(2.0 * rest, root, out=np.zeros_like(rest), where=root > 0.0)
    return np.asarray(x[k] + np.clip(into, 0.0, step[k]))


def peaks(x: Floats, density: Floats, least: float = 0.01) -> tuple[Alias, ...]:
    """Return the peaks with at least the share `least`, the highest first."""
    edges = _valleys(density)
    mass = 0.5 * np.diff(x) * (density[:-1] + density[1:])
    below = np.concatenate([[0.0], np.cumsum(mass)]) / mass.sum()
    found = []
    for left, right in pairwise(edges):
        top = left + int(np.argmax(density[left : right + 1]))
        found.append((density[top], Alias(float(x[top]), float(below[right] - below[left]))))
    found.sort(key=lambda pair: -pair[0])
    return (found[0][1], *(alias for _, alias in found[1:] if alias.share >= least))


def _valleys(density: Floats) -> list[int]:
    """Return the ends of the grid and the minima that part its peaks."""
    edges, top, low, place = [0], density[0], density[0], 0
    for k, value in enumerate(density):
        if value < low:
            low, place = value, k
        # `top` is the peak before the lowest point since, `value` a rise after it.
        if value > low and low < DIP * min(top, value):
            edges.append(place)
            top, low, place = value, value, k
        elif value > top:
            top, low, place = value, value, k
    return [*edges, density.size - 1]
