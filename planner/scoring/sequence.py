"""Confidence in a share that holds however often one looks: evidence that may stop a race.

A test that is looked at after every round says "sure" too often if each look is treated as the
only one. The evidence used here does not: the likelihood ratio of "the share is spread evenly over
the values above g" against "the share is g" is a supermartingale for every share up to g, so that
it ever exceeds 1 / alpha with probability at most alpha (Ville 1939), whatever decides when to
stop. Mixtures over a continuous alternative are Robbins' (1970, Ann. Math. Stat. 41, 1397).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import betaincc, betaln, xlog1py, xlogy

from planner.scoring.intervals import wilson

__all__ = ["ALPHA", "final_bounds", "log_evidence_above", "log_evidence_below", "sequence_bounds"]

Floats = NDArray[np.float64]

ALPHA = 0.1
"""Chance that a bound fails at any look."""

Z_HALF_ALPHA = 1.6448536269514722
"""Normal quantile of 1 - ALPHA / 2."""

STEPS = 40


def log_evidence_above(hits: ArrayLike, trials: ArrayLike, share: ArrayLike) -> Floats:
    """Return ln of the evidence that a share lies above `share`, in (0, 1).

    Parameters
    ----------
    hits, trials, share : array_like
        Broadcast together.
    """
    k, n, g = (np.asarray(a, dtype=np.float64) for a in (hits, trials, share))
    misses = n - k
    with np.errstate(divide="ignore"):
        mixture = betaln(k + 1, misses + 1) + np.log(betaincc(k + 1, misses + 1, g))
    return np.asarray(mixture - np.log1p(-g) - xlogy(k, g) - xlog1py(misses, -g))


def log_evidence_below(hits: ArrayLike, trials: ArrayLike, share: ArrayLike) -> Floats:
    """Return ln of the evidence that a share lies below `share`, in (0, 1)."""
    k, n, g = (np.asarray(a, dtype=np.float64) for a in (hits, trials, share))
    return log_evidence_above(n - k, n, 1.0 - g)


def sequence_bounds(
    hits: ArrayLike, trials: ArrayLike, alpha: float = ALPHA
) -> tuple[Floats, Floats]:
    """Return a lower and an upper bound, each of which fails at any look with chance `alpha`."""
    k, n = np.broadcast_arrays(np.asarray(hits, np.float64), np.asarray(trials, np.float64))
    return _lower(k, n, alpha), 1.0 - _lower(n - k, n, alpha)


def _lower(k: Floats, n: Floats, alpha: float) -> Floats:
    """Return the greatest share that the evidence excludes, by halving."""
    lo, hi = np.zeros(k.shape), np.full(k.shape, 1.0)
    for _ in range(STEPS):
        middle = 0.5 * (lo + hi)
        excluded = log_evidence_above(k, n, middle) >= -np.log(alpha)
        # Above the share found nothing is evidence; excluded shares form one run from 0.
        excluded &= middle * n < k
        lo, hi = np.where(excluded, middle, lo), np.where(excluded, hi, middle)
    return lo


def final_bounds(hits: ArrayLike, trials: ArrayLike, most: int) -> tuple[Floats, Floats]:
    """Return bounds of a race that ends, for each share, after `most` trials at the latest.

    Half of `ALPHA` is spent on looks along the way, the other half on one fixed look (Wilson's) at
    the very end, where that is the tighter one.
    """
    k, n = np.broadcast_arrays(np.asarray(hits, np.float64), np.asarray(trials, np.float64))
    lo, hi = sequence_bounds(k, n, ALPHA / 2)
    end_lo, end_hi = wilson(k, n, Z_HALF_ALPHA)
    ended = n >= most
    return np.where(ended, np.maximum(lo, end_lo), lo), np.where(ended, np.minimum(hi, end_hi), hi)
