"""Joint likelihood of continuum and line under a damped random walk and its response.

Continuum: ``offset of the telescope + sigma x(t) + noise``. Line: ``offset + scale sigma
(response * x)(t) + noise``. x is a unit damped random walk; the joint covariance follows Rybicki
& Press (1992, ApJ 398, 169), the offsets are integrated out under flat priors. The likelihood is
taken as p(continuum) p(line | continuum): the first factor knows nothing of the lag.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels.joint_line import line_log_density, walk_factor, whitened
from planner.recovery.response import Response, cross_covariance, line_covariance

__all__ = ["Factor", "Pair", "continuum_factor", "joint_log_likelihood", "line_given", "make_pair"]

Floats = NDArray[np.float64]

LEAST_ERROR = 1e-4
"""Smallest error, in units of the curve's own scatter: exact data make the algebra singular."""

STACK = 8
"""Lags worked on at once, so that their covariances stay in the processor's cache."""


@dataclass(frozen=True, slots=True)
class Pair:
    """Two light curves ready for the algebra: finite, ascending, counted from a near zero."""

    t1_d: Floats
    y1: Floats
    e1: Floats
    offsets: Floats
    """(n, telescopes), 1 where an epoch belongs to the telescope."""
    t2_d: Floats
    y2: Floats
    e2: Floats


@dataclass(frozen=True, slots=True)
class Factor:
    """The continuum's covariance, factored, for one walk."""

    sigma: float
    tau_d: float
    walk: tuple[Floats, Floats, Floats]
    basis: Floats
    """Whitened offsets, orthonormal, (telescopes, n)."""
    y: Floats
    """Whitened continuum over sigma, (n,)."""
    log_likelihood: float
    """Of the continuum alone, offsets integrated out."""


def make_pair(
    t1_d: ArrayLike,
    flux1: ArrayLike,
    error1: ArrayLike,
    t2_d: ArrayLike,
    flux2: ArrayLike,
    error2: ArrayLike,
    telescope1: ArrayLike | None = None,
) -> Pair:
    """Return two light curves as the algebra wants them.

    Parameters
    ----------
    t1_d, flux1, error1 : array (n,), error may be one number
        Continuum; any order, times may repeat. Epochs with a non-finite value or a negative
        error are left out; an error below `LEAST_ERROR` of the curve's scatter is raised to it.
    t2_d, flux2, error2 : array (m,)
        Line.
    telescope1 : array (n,) or None
        Label of the telescope of each continuum epoch; each has an offset of its own.
    """
    t1, y1, e1, used = _usable(t1_d, flux1, error1)
    t2, y2, e2, _ = _usable(t2_d, flux2, error2)
    labels = np.zeros(t1.size) if telescope1 is None else np.asarray(telescope1)[used]
    offsets = (labels[:, None] == np.unique(labels)).astype(np.float64)
    zero_d = min((float(t[0]) for t in (t1, t2) if t.size), default=0.0)
    return Pair(t1 - zero_d, y1, e1, offsets, t2 - zero_d, y2, e2)


def _usable(
    t_d: ArrayLike, flux: ArrayLike, error: ArrayLike
) -> tuple[Floats, Floats, Floats, NDArray[np.intp]]:
    """Return finite epochs in time order, fluxes about their mean, and which they are."""
    t, f, e = np.broadcast_arrays(
        *(np.atleast_1d(np.asarray(a, dtype=np.float64)) for a in (t_d, flux, error))
    )
    used = np.flatnonzero(np.isfinite(t) & np.isfinite(f) & np.isfinite(e) & (e >= 0.0))
    used = used[np.argsort(t[used], kind="stable")]
    t, f, e = t[used], f[used], e[used]
    if t.size:
        f = f - f.mean()
        e = np.maximum(e, LEAST_ERROR * f.std())
    return t, f, e, used


def continuum_factor(pair: Pair, sigma: float, tau_d: float) -> Factor:
    """Return the continuum's covariance, factored in linear time, and its likelihood.

    Parameters
    ----------
    pair : Pair
    sigma, tau_d : float
        Asymptotic rms in the unit of the continuum's flux, and damping timescale; both > 0.
    """
    walk = walk_factor(pair.t1_d, pair.e1 / sigma, tau_d)
    columns = whitened(*walk, np.column_stack([pair.y1 / sigma, pair.offsets]))
    y = np.ascontiguousarray(columns[:, 0])
    basis, triangle = np.linalg.qr(columns[:, 1:])
    rest = y - basis @ (basis.T @ y)
    n, p = pair.offsets.shape
    log_det = np.log(walk[2]).sum() + np.log(np.abs(np.diag(triangle))).sum()
    free = (n - p) * math.log(math.sqrt(2.0 * math.pi) * sigma)
    value = -0.5 * rest @ rest - log_det - free
    return Factor(sigma, tau_d, walk, np.ascontiguousarray(basis.T), y, float(value))


def line_given(
    pair: Pair,
    factor: Factor,
    lags_d: Floats,
    response: Response,
    scale: float,
    scale_dex: float = 0.0,
    related: bool = True,
) -> tuple[Floats, Floats]:
    """Return ln p(line | continuum) for each lag, and the best scale.

    Parameters
    ----------
    pair : Pair
    factor : Factor
    lags_d : array (k,)
    response : Response
    scale : float
        Line flux per continuum flux of the response, > 0: the median of its prior.
    scale_dex : float
        Scatter of its log-normal prior, over which the density is averaged numerically (the
        scale enters the covariance, so there is no closed form); 0: the scale is known.
    related : bool
        False: of a line that varies in the same way and knows nothing of the continuum.

    Returns
    -------
    log_density, best_scale : array (k,)
        The latter is where density times prior peaks.
    """
    density, best = np.empty(lags_d.size), np.empty(lags_d.size)
    log_rms = math.log(scale * factor.sigma)
    spread = scale_dex * math.log(10.0)
    for start in range(0, lags_d.size, STACK):
        part = slice(start, start + STACK)
        cross = cross_covariance(pair.t1_d, pair.t2_d, lags_d[part], factor.tau_d, response)
        if not related:
            cross[:] = 0.0
        line = line_covariance(pair.t2_d, lags_d[part], factor.tau_d, response)
        density[part], best[part] = line_log_density(
            factor.walk, factor.basis, factor.y, cross, line, pair.y2, pair.e2, log_rms, spread
        )
    return density, np.exp(best) / factor.sigma


def joint_log_likelihood(
    pair: Pair, lags_d: ArrayLike, sigma: float, tau_d: float, scale: float, response: Response
) -> Floats:
    """Return the log likelihood of both curves for each lag, everything but the offsets known.

    Parameters
    ----------
    pair : Pair
        From `make_pair`.
    lags_d : array (k,)
    sigma, tau_d : float
        Rms of the continuum's walk and its timescale, > 0.
    scale : float
        Line flux per continuum flux of the response, > 0.
    response : Response

    Returns
    -------
    array (k,)
        The flat priors of the offsets have density 1 per unit of flux.

    Raises
    ------
    ValueError
        If a parameter is not positive.
    """
    if not (sigma > 0.0 and tau_d > 0.0 and scale > 0.0):
        raise ValueError(f"need sigma, tau_d and scale > 0, got {sigma}, {tau_d} and {scale}")
    lags = np.atleast_1d(np.asarray(lags_d, dtype=np.float64))
    factor = continuum_factor(pair, float(sigma), float(tau_d))
    return factor.log_likelihood + line_given(pair, factor, lags, response, float(scale))[0]
