"""How well given epochs tell one lag from another, and how often a lag would be recovered.

The divergence of Kullback & Leibler (1951, Ann. Math. Stat. 22, 79) between the true lag and
another one is the mean log likelihood ratio in favour of the truth, D. Where the two differ in a
known signal the ratio is Gaussian with mean D and variance 2 D, so that the other lag wins with
probability Phi(-sqrt(D / 2)).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels.joint_line import walk_factor, whitened
from planner.recovery.information import Design, orthonormal
from planner.recovery.response import cross_covariance, line_covariance

__all__ = ["Ambiguity", "ambiguity", "covariances", "factor_of"]

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Ambiguity:
    """The truth against each other lag at the same epochs, (k,)."""

    lags_d: Floats
    divergence: Floats
    """In nats; 0 at the true lag, NaN where there is a reason."""
    mistaken: Floats
    """Probability that the other lag is the likelier of the two."""
    reason: str


def factor_of(design: Design) -> tuple[tuple[Floats, Floats, Floats], Floats]:
    """Return the factor of the continuum's unit covariance and its whitened offsets.

    The offsets are orthonormal rows, (telescopes, n).
    """
    factor = walk_factor(design.t1_d, design.e1 / design.sigma, design.tau_d)
    basis = orthonormal(whitened(*factor, design.offsets))
    return factor, basis


def covariances(design: Design, lags_d: Floats) -> tuple[Floats, Floats, Floats]:
    """Return the covariances of a response of unit rms, that with the continuum whitened.

    Parameters
    ----------
    design : Design
    lags_d : array (k,)

    Returns
    -------
    white : array (k, n, m)
    line : array (k, m, m)
    basis : array (n, telescopes)
        Whitened offsets of the continuum, orthonormal.
    """
    walk, basis = factor_of(design)
    cross = cross_covariance(design.t1_d, design.t2_d, lags_d, design.tau_d, design.response)
    for k in range(lags_d.size):
        cross[k] = whitened(*walk, cross[k])
    line = line_covariance(design.t2_d, lags_d, design.tau_d, design.response)
    return cross, line, np.ascontiguousarray(basis.T)


def ambiguity(design: Design, lags_d: ArrayLike) -> Ambiguity:
    """Return the divergence of each lag from the true one, all else known but the offsets.

    ``D = 1/2 {tr[S^-1 (S0 + d d')] - rank + ln(|S| / |S0|)}`` with S the covariance of the line
    given the continuum at the other lag, S0 at the true one, and d d' the mean square of what the
    two expect differently of the line; all of it for contrasts, which know nothing of the offset.

    Parameters
    ----------
    design : Design
    lags_d : array (k,)
        Lags to tell from `design.lag_d`.
    """
    from scipy.linalg import solve_triangular
    from scipy.special import ndtr

    lags = np.atleast_1d(np.asarray(lags_d, dtype=np.float64))
    if design.reason:
        nothing = np.full(lags.size, math.nan)
        return Ambiguity(lags, nothing, nothing, design.reason)
    white, line, basis = covariances(design, np.concatenate([[design.lag_d], lags]))
    white -= basis @ (basis.T @ white)
    m = design.t2_d.size
    contrast = np.linalg.qr(np.column_stack([np.ones(m), np.eye(m)[:, : m - 1]]))[0][:, 1:]
    white = white @ contrast
    noise = (contrast.T * design.e2**2) @ contrast
    variance = (design.scale * design.sigma) ** 2
    unit = contrast.T @ line @ contrast - np.swapaxes(white, 1, 2) @ white
    lower = np.linalg.cholesky(variance * unit + noise)
    log_det = np.log(np.diagonal(lower, axis1=1, axis2=2)).sum(axis=1)
    divergence = np.empty(lags.size)
    for k in range(lags.size):
        shift = math.sqrt(variance) * (white[k + 1] - white[0]).T
        solved = solve_triangular(lower[k + 1], np.hstack([lower[0], shift]), lower=True)
        divergence[k] = 0.5 * (np.sum(solved**2) - (m - 1)) + log_det[k + 1] - log_det[0]
    divergence = np.maximum(divergence, 0.0)
    return Ambiguity(lags, divergence, np.asarray(ndtr(-np.sqrt(0.5 * divergence))), "")
