"""What given epochs can say about a lag before anything is observed: the Fisher information."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels import joint_response
from planner.kernels.joint_line import walk_factor, whitened
from planner.kernels.products import inverse_factor, product
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


def with_normal_points(design: Design, share: float) -> Design:
    """Return the design with epochs of a telescope averaged that lie close together.

    Weights are the inverse squares of the errors.

    Parameters
    ----------
    design : Design
    share : float
        Length of the bins in time over lag, timescale or span, whichever is shortest.
    """
    if design.reason:
        return design
    span_d = min(float(np.ptp(design.t1_d)), float(np.ptp(design.t2_d)))
    length_d = share * min(abs(design.lag_d), design.tau_d, span_d)
    if not length_d > 0.0:
        return design
    which = np.argmax(design.offsets, axis=1)
    t1, e1, telescope = _averaged(design.t1_d, design.e1, which, length_d)
    t2, e2, _ = _averaged(design.t2_d, design.e2, np.zeros(design.t2_d.size, np.intp), length_d)
    offsets = np.eye(design.offsets.shape[1])[telescope]
    return replace(design, t1_d=t1, e1=e1, offsets=offsets, t2_d=t2, e2=e2)


def _averaged(
    t_d: Floats, error: Floats, telescope: NDArray[np.intp], length_d: float
) -> tuple[Floats, Floats, NDArray[np.intp]]:
    """Return mean times, errors and telescope of each bin that has an epoch, in time order."""
    bins = np.floor(t_d / length_d).astype(np.intp)
    number = telescope.max() + 1
    kept, which = np.unique(bins * number + telescope, return_inverse=True)
    weight = np.bincount(which, error**-2.0)
    t = np.bincount(which, t_d * error**-2.0) / weight
    order = np.argsort(t, kind="stable")
    return t[order], np.sqrt(1.0 / weight[order]), np.asarray(kept % number)[order]


@dataclass(frozen=True, slots=True)
class FisherForecast:
    """The least error with which a lag can be known near its true value."""

    error_d: float
    """Of the lag, everything else unknown but for its prior; NaN where there is a reason."""
    error_known_d: float
    """Of the lag, everything known but the offsets, where they are not."""
    matrix: Floats
    """Information on lag, ln sigma, ln tau and ln scale, priors included, (4, 4); of what is known
    infinite, and 0 beside the diagonal."""
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
    (Patterson & Thompson 1971, Biometrika 58, 545); worked out as the continuum's information
    plus that of the line given the continuum. The response keeps its width in days when the
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
    priors = (sigma_dex, tau_dex, scale_dex)
    matrix = _information(design, offsets_known, (True, *(dex > 0.0 for dex in priors)))
    for k, dex in enumerate(priors, start=1):
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


def _information(design: Design, offsets_known: bool, asked: tuple[bool, ...]) -> Floats:
    """Return the information without priors, (4, 4), 0 for parameters that are not asked for.

    The continuum, freed of its offsets and whitened, has unit covariance; given it the line has
    the mean ``b' x`` and the covariance S. Each derivative has a part in the continuum's
    covariance (`own`), one in the line's mean (`mean`) and one in S (`given`), the latter two
    whitened by S and freed of the line's offset.
    """
    factor = walk_factor(design.t1_d, design.e1 / design.sigma, design.tau_d)
    basis = orthonormal(whitened(*factor, design.offsets))[: 0 if offsets_known else None]

    def white(columns: Floats) -> Floats:
        return free(whitened(*factor, np.ascontiguousarray(columns)), basis)

    cross, line = _line_blocks(design, design.lag_d, design.tau_d)
    b = np.ascontiguousarray(white(cross).T)
    error = design.e2 / (design.sigma * design.scale)
    root = inverse_factor(line - product(b, b) + np.diag(error**2))
    ones = orthonormal(root.sum(axis=1)[:, None])[: 0 if offsets_known else None]
    n, m = cross.shape
    first = n * n if any(asked[1:3]) else 0
    parts = np.zeros((4, first + m * m + n * m))
    for k, part in enumerate(parts):
        if not asked[k]:
            continue
        by_own, by_cross, by_line = _derivative(design, k, cross, line)
        mean, given = white(by_cross), by_line
        if by_own is not None:
            own = white(white(by_own).T)
            via = product(own, b)
            mean -= via
            given = given - product(b, np.ascontiguousarray(via.T))
            part[:first] = math.sqrt(0.5) * own.ravel()
        mixed = product(b, np.ascontiguousarray(mean.T))
        given = product(product(root, given - mixed - mixed.T), root)
        given = free(free(given, ones).T, ones)
        part[first : first + m * m] = math.sqrt(0.5) * given.ravel()
        part[first + m * m :] = free(product(root, mean), ones).ravel()
    return np.asarray(product(parts, parts))


def orthonormal(columns: Floats) -> Floats:
    """Return orthonormal rows that span a few columns, after Gram and Schmidt."""
    rows = np.zeros(columns.T.shape)
    for k, column in enumerate(columns.T):
        rest = free(column[:, None].copy(), rows[:k])[:, 0]
        rows[k] = rest / math.sqrt(np.sum(rest * rest))
    return rows


def free(columns: Floats, rows: Floats) -> Floats:
    """Take what lies along orthonormal `rows` (p, n) off `columns` (n, k), and return these."""
    for row in rows:
        columns -= row[:, None] * np.einsum("i,ij->j", row, columns)
    return columns


def _line_blocks(design: Design, lag_d: float, tau_d: float) -> tuple[Floats, Floats]:
    """Return the unit covariances continuum-line and line-line; the width is that of the truth."""
    code, t1, t2 = design.response.code, design.t1_d, design.t2_d
    width = design.response.widths_d(np.array([design.lag_d]))
    cross = joint_response.cross_covariance(code, t1, t2, np.array([lag_d]), width, tau_d)[0]
    return cross, joint_response.line_covariance(code, t2, width, tau_d)[0]


def _derivative(
    design: Design, parameter: int, cross: Floats, line: Floats
) -> tuple[Floats | None, Floats, Floats]:
    """Return how the unit covariance's blocks change with lag, ln sigma, ln tau or ln scale."""
    tau, lag = design.tau_d, design.lag_d
    if parameter == 0:
        step = 1e-5 * tau
        late, early = (_line_blocks(design, lag + s, tau)[0] for s in (step, -step))
        return None, (late - early) / (2.0 * step), np.zeros_like(line)
    if parameter == 3:
        return None, cross, 2.0 * line
    apart = np.abs(design.t1_d[:, None] - design.t1_d) / tau
    own = np.exp(-apart)
    if parameter == 1:
        return 2.0 * own, 2.0 * cross, 2.0 * line
    step = 1e-5
    up, down = (_line_blocks(design, lag, tau * math.exp(s)) for s in (step, -step))
    by_cross, by_line = ((a - b) / (2.0 * step) for a, b in zip(up, down, strict=True))
    return own * apart, by_cross, by_line


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
