"""Logistic regression of outcomes, kept finite by a ridge."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Logistic", "fit_logistic"]

MOST_STEPS = 200
SMALLEST_SHARE = 1e-9
"""Of a Newton step, below which halving it is given up: only rounding changes the sum."""


@dataclass(frozen=True, slots=True)
class Logistic:
    """A fitted model: the log odds are linear in the columns."""

    coefficients: NDArray[np.float64]
    """(k,)"""
    covariance: NDArray[np.float64]
    """(k, k)"""

    def predict(self, x: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the probability of each row of `x` (n, k)."""
        return _expit(x @ self.coefficients)

    def interval(
        self, x: NDArray[np.float64], z: float
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return both ends of each row's probability, `z` standard errors off in the log odds."""
        odds = x @ self.coefficients
        half = z * np.sqrt(np.einsum("ij,jk,ik->i", x, self.covariance, x))
        return _expit(odds - half), _expit(odds + half)


def fit_logistic(x: NDArray[np.float64], y: NDArray[np.bool_], ridge: float) -> Logistic:
    """Maximise the log likelihood less ``ridge / 2`` times the sum of squared coefficients.

    The ridge is a normal prior of standard deviation ``ridge**-0.5`` on every coefficient, that of
    a column of ones included (none is added here): so there is one maximum, and a finite one, even
    where the outcomes are all alike or separated, or columns repeat each other or outnumber rows.
    Columns should be of the order of 1. Found by Newton's steps (iteratively reweighted least
    squares), halved where they overshoot; the covariance is the inverse of the curvature at the
    maximum, that of the prior included.

    Parameters
    ----------
    x : ndarray of float, shape (n, k)
    y : ndarray of bool, shape (n,)
    ridge : float
        Above 0.

    Raises
    ------
    ValueError
        If the ridge is not above 0, shapes differ, or `x` is not finite.
    """
    if not ridge > 0:
        raise ValueError(f"ridge {ridge} must be above 0")
    if x.ndim != 2 or y.shape != x.shape[:1] or not np.all(np.isfinite(x)):
        raise ValueError(f"columns {x.shape} and outcomes {y.shape} must match and be finite")
    sign = np.where(y, 1.0, -1.0)
    prior = ridge * np.eye(x.shape[1])

    def cost(b: NDArray[np.float64]) -> float:
        return float(np.logaddexp(0.0, -sign * (x @ b)).sum() + ridge / 2 * (b @ b))

    b = np.zeros(x.shape[1])
    for _ in range(MOST_STEPS):
        p = _expit(x @ b)
        step = np.linalg.solve(_curvature(x, p, prior), x.T @ (y - p) - ridge * b)
        share, now = 1.0, cost(b)
        while share > SMALLEST_SHARE and cost(b + share * step) > now:
            share /= 2
        if share <= SMALLEST_SHARE:
            break
        b = b + share * step
        if np.all(np.abs(step) <= 1e-10 * (1 + np.abs(b))):
            break
    return Logistic(b, np.asarray(np.linalg.inv(_curvature(x, _expit(x @ b), prior)), float))


def _curvature(
    x: NDArray[np.float64], p: NDArray[np.float64], prior: NDArray[np.float64]
) -> NDArray[np.float64]:
    curvature: NDArray[np.float64] = (x * (p * (1 - p))[:, None]).T @ x + prior
    return curvature


def _expit(odds: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the probability of log odds, without overflow."""
    small = np.exp(-np.abs(odds))
    share: NDArray[np.float64] = np.where(odds >= 0, 1.0, small) / (1 + small)
    return share
