"""Confidence intervals of shares."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["Z_90_ONE_SIDED", "wilson"]

Z_90_ONE_SIDED = 1.2815515655446004
"""Normal quantile of 0.9: each end of an interval holds with 90 % confidence."""


def wilson(
    hits: ArrayLike, trials: ArrayLike, z: float = Z_90_ONE_SIDED
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the score interval of a share (Wilson 1927, J. Am. Stat. Assoc. 22, 209).

    Parameters
    ----------
    hits, trials : array_like
        Counts, broadcast together; no trials give the interval 0 to 1.
    z : float
        Normal quantile. The default makes each end a one-sided 90 % bound.
    """
    k, n = np.broadcast_arrays(np.asarray(hits, float), np.asarray(trials, float))
    with np.errstate(divide="ignore", invalid="ignore"):
        p = k / n
        centre = (p + z * z / (2 * n)) / (1 + z * z / n)
        half = z / (1 + z * z / n) * np.sqrt(p * (1 - p) / n + z * z / (4 * n * n))
    empty = n == 0
    lower = np.where(empty, 0.0, np.clip(centre - half, 0.0, 1.0))
    upper = np.where(empty, 1.0, np.clip(centre + half, 0.0, 1.0))
    return lower, upper
