"""What given epochs can say about a lag before anything is observed: the Fisher information."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels import joint_response
from planner.recovery.response import Response

__all__ = ["Design", "FisherForecast", "fisher_forecast", "knapp_carter_error", "make_design"]

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Design:
    """Epochs, errors and the truth that is assumed, ready for the algebra; see `make_design`."""

    t1_d: Floats
    e1: Floats
    offsets: Floats
    t2_d: Floats
    e2: Floats
    lag_d: float
    sigma: float
    tau_d: float
    scale: float
    response: Response
    reason: str
    """Why nothing can be said; empty where something can."""


def make_design(
    t1_d: ArrayLike,
    error1: ArrayLike,
    t2_d: ArrayLike,
    error2: ArrayLike,
    lag_d: float,
    sigma: float,
    tau_d: float,
    scale: float,
    response: Response,
    telescope1: ArrayLike | None = None,
) -> Design:
    """Return one assumed truth at given epochs.

    Parameters
    ----------
    t1_d, error1 : array (n,), error may be one number
        Continuum; any order. Epochs that are not finite or have no positive error are left out.
    t2_d, error2 : array (m,)
        Line.
    lag_d : float
        True lag, observed frame.
    sigma, tau_d : float
        Rms of the continuum's walk in its flux unit, and its timescale.
    scale : float
        Line flux per continuum flux.
    response : Response
    telescope1 : array (n,) or None
        Telescope of each continuum epoch; each has an offset of its own.
    """
    t1, e1, used = _usable(t1_d, error1)
    t2, e2, _ = _usable(t2_d, error2)
    labels = np.zeros(t1.size) if telescope1 is None else np.asarray(telescope1)[used]
    offsets = (labels[:, None] == np.unique(labels)).astype(np.float64)
    reason = ""
    if min(t1.size - offsets.shape[1] + 1, t2.size) < 2:
        reason = "a light curve has fewer than 2 usable epochs"
    truth = np.array([sigma, tau_d, scale])
    if not (np.isfinite(lag_d) and np.all(np.isfinite(truth) & (truth > 0.0))):
        reason = "the truth assumed is impossible"
    zero_d = min((float(t[0]) for t in (t1, t2) if t.size), default=0.0)
    return Design(
        t1 - zero_d, e1, offsets, t2 - zero_d, e2,
        float(lag_d), float(sigma), float(tau_d), float(scale), response, reason,
    )  # fmt: skip


def _usable(t_d: ArrayLike, error: ArrayLike) -> tuple[Floats, Floats, NDArray[np.intp]]:
    """Return finite epochs in time order and which they are."""
    t, e = np.broadcast_arrays(
        *(np.atleast_1d(np.asarray(a, dtype=np.float64)) for a in (t_d, error))
    )
    used = np.flatnonzero(np.isfinite(t) & np.isfinite(e) & (e > 0.0))
    used = used[np.argsort(t[used], kind="stable")]
    return t[used], e[used], used


@dataclass(frozen=True, slots=True)
class FisherForecast:
    """The least error with which a lag can be known near its true value."""

    error_d: float
    """Of the lag, everything else unknown but for its prior; NaN where there is a reason."""
    error_known_d: float
    """Of the lag, everything known but the offsets, where they are not."""
    matrix: Floats
    """Information on lag, ln sigma, ln tau and ln scale, priors included, (4, 4)."""
    reason: str


def fisher_forecast(
    design: Design,
    sigma_dex: float = math.inf,
    tau_dex: float = math.inf,
    scale_dex: float = math.inf,
    offsets_known: bool = False,
) -> FisherForecast:
    """Return the Fisher information of the lag at the design's epochs.

    ``F_ij = 1/2 tr(P C_i P C_j)``, C the joint covariance of both curves, C_i its derivatives (by
    central differences), P its inverse freed of the offsets, as for a restricted likelihood
    (Patterson & Thompson 1971, Biometrika 58, 545). The response keeps its width in days when the
    lag is varied: a width is hardly ever known well enough to tell the lag.

    Parameters
    ----------
    design : Design
    sigma_dex, tau_dex, scale_dex : float
        Scatters of log-normal priors about the truth.
    offsets_known : bool
        Whether the mean fluxes are known, as bounds in the literature take them.
    """
    if design.reason:
        return FisherForecast(math.nan, math.nan, np.full((4, 4), math.nan), design.reason)
    projector = _projector(design, offsets_known)
    products = [projector @ derivative for derivative in _derivatives(design)]
    matrix = np.array([[0.5 * np.sum(a * b.T) for b in products] for a in products])
    for k, dex in enumerate((sigma_dex, tau_dex, scale_dex), start=1):
        matrix[k, k] += 1.0 / (dex * math.log(10.0)) ** 2 if dex > 0.0 else math.inf
    known = float(matrix[0, 0]) ** -0.5 if matrix[0, 0] > 0.0 else math.inf
    return FisherForecast(_marginal_error(matrix), known, matrix, "")


def _marginal_error(matrix: Floats) -> float:
    """Return the first parameter's error; parameters with infinite information are known."""
    free = np.flatnonzero(np.isfinite(np.diag(matrix)))
    part = matrix[np.ix_(free, free)]
    size = np.sqrt(np.diag(part))
    if not size[0] > 0.0:
        return math.inf
    size[size == 0.0] = 1.0
    inverse = np.linalg.pinv(part / np.outer(size, size), rcond=1e-12, hermitian=True)
    return float(math.sqrt(inverse[0, 0]) / size[0])


def _blocks(design: Design, lag_d: float, tau_d: float) -> tuple[Floats, Floats, Floats]:
    """Return the unit covariances continuum-continuum, continuum-line, line-line."""
    code, t1, t2 = design.response.code, design.t1_d, design.t2_d
    width = design.response.widths_d(np.array([design.lag_d]))
    own = np.exp(-np.abs(t1[:, None] - t1) / tau_d)
    cross = joint_response.cross_covariance(code, t1, t2, np.array([lag_d]), width, tau_d)[0]
    return own, cross, joint_response.line_covariance(code, t2, width, tau_d)[0]


def _joined(own: Floats, cross: Floats, line: Floats) -> Floats:
    """Return one matrix of the three blocks."""
    return np.block([[own, cross], [cross.T, line]])


def _projector(design: Design, offsets_known: bool) -> Floats:
    """Return the inverse covariance, freed of the offsets unless they are known."""
    n, p = design.offsets.shape
    own, cross, line = _blocks(design, design.lag_d, design.tau_d)
    q = design.scale
    covariance = design.sigma**2 * _joined(own, q * cross, q * q * line)
    covariance[np.diag_indices_from(covariance)] += np.concatenate([design.e1, design.e2]) ** 2
    columns = np.zeros((covariance.shape[0], p + 1))
    columns[:n, :p], columns[n:, p] = design.offsets, 1.0
    inverse = np.linalg.inv(covariance)
    if offsets_known:
        return np.asarray(inverse)
    solved = inverse @ columns
    return np.asarray(inverse - solved @ np.linalg.solve(columns.T @ solved, solved.T))


def _derivatives(design: Design) -> list[Floats]:
    """Return the covariance's derivatives by lag, ln sigma, ln tau and ln scale."""
    variance, q, tau, lag = design.sigma**2, design.scale, design.tau_d, design.lag_d
    own, cross, line = _blocks(design, lag, tau)
    step = 1e-5 * tau
    late, early = _blocks(design, lag + step, tau)[1], _blocks(design, lag - step, tau)[1]
    slope = variance * q * (late - early) / (2.0 * step)
    log_step = 1e-5
    up, down = (_blocks(design, lag, tau * math.exp(s)) for s in (log_step, -log_step))
    by_tau = [variance * (a - b) / (2.0 * log_step) for a, b in zip(up, down, strict=True)]
    return [
        _joined(np.zeros_like(own), slope, np.zeros_like(line)),
        2.0 * variance * _joined(own, q * cross, q * q * line),
        _joined(by_tau[0], q * by_tau[1], q * q * by_tau[2]),
        variance * _joined(np.zeros_like(own), q * cross, 2.0 * q * q * line),
    ]


def knapp_carter_error(
    step_d: float, duration_d: float, tau_d: float, noise_over_rms: float
) -> float:
    """Return the least error of the delay between two evenly sampled noisy copies of a walk.

    Knapp & Carter (1976, IEEE Trans. ASSP 24, 320), as quoted from memory: ``1 / {2 T int_0^fmax
    (2 pi f)^2 g / (1 - g) df}`` with ``g / (1 - g) = S^2 / (2 S N + N^2)``, ``S = 2 s^2 tau / (1 +
    (2 pi f tau)^2)``, ``N = n^2 dt``, ``fmax = 1 / (2 dt)``. It holds for long data without
    aliasing, T >> lag, dt << tau.

    Parameters
    ----------
    step_d, duration_d, tau_d : float
        Sampling, length and damping timescale.
    noise_over_rms : float
        Error of each epoch of either curve over the walk's rms.
    """
    edges = np.linspace(0.0, 0.5 / step_d, 20001)
    f = 0.5 * (edges[1:] + edges[:-1])
    signal = 2.0 * tau_d / (1.0 + (2.0 * math.pi * f * tau_d) ** 2)
    noise = noise_over_rms**2 * step_d
    density = (2.0 * math.pi * f) ** 2 * signal**2 / (2.0 * signal * noise + noise**2)
    return float((2.0 * duration_d * density.sum() * (edges[1] - edges[0])) ** -0.5)
