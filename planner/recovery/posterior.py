"""Posterior density of the lag from the joint likelihood of both light curves."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.recovery.density import Alias, log_integral, normalised, peaks, quantiles
from planner.recovery.joint import Factor, Pair, line_given, make_pair
from planner.recovery.response import Response
from planner.recovery.walk_nodes import walk_nodes

__all__ = ["Belief", "LagPosterior", "lag_posterior"]

Floats = NDArray[np.float64]

MIN_EPOCHS = 3
"""Fewest epochs of each curve: an offset and a scale use up two of the line's."""

NEGLIGIBLE = 16.0
"""Fall of the log density below its peak at which a lag is not looked at more closely."""

MOST = 120
"""Most intervals of the first grid of lags."""

STEEP = 0.6
"""Greatest change of the log density between neighbours near its peak."""

UNRELATED = 9
"""Lags at which an unrelated line is looked at: only the width of its response hangs on them."""

FULL = 24
"""Lags, about, at which every combination of walk and width is worked out."""


@dataclass(frozen=True, slots=True)
class Belief:
    """What is held before the data are seen; log-normal: median and scatter in dex (0: known)."""

    tau_d: float
    """Damping timescale, observed frame."""
    tau_dex: float = 0.35
    sigma: float | None = None
    """Rms of the continuum's walk, in its flux unit; None: the curve's own scatter."""
    sigma_dex: float = 0.5
    scale: float | None = None
    """Line flux per continuum flux; None: ratio of the curves' scatters."""
    scale_dex: float = 0.5
    responses: tuple[Response, ...] = (
        Response("top_hat", 0.3),
        Response("top_hat", 0.8),
        Response("top_hat", 1.4),
    )
    """Response functions to average over."""
    weights: tuple[float, ...] | None = None
    """Their probabilities; None: equal."""


@dataclass(frozen=True, slots=True)
class LagPosterior:
    """What the likelihood makes of two light curves; lags in observed-frame days."""

    lag_d: float
    """Median; NaN where there is no lag."""
    lag_lo_d: float
    """16th percentile."""
    lag_hi_d: float
    """84th percentile."""
    peak_d: float
    """Where the density is highest."""
    primary_share: float
    """Probability in the highest peak."""
    aliases: tuple[Alias, ...]
    """Peaks with 1 % of the probability or more, the highest first."""
    log_odds: float
    """ln of the odds that the line echoes the continuum rather than varying in the same way without
    knowing of it, for even odds beforehand. Unrelated lines reach ln k at most once in k times
    (Markov's inequality)."""
    reason: str
    """Why there is no lag; empty where there is one."""
    lags_d: Floats
    """Ascending, finer where the density is peaked, (k,)."""
    density: Floats
    """Per day, unit area, (k,)."""
    log_density: Floats
    """Its logarithm, finite also where the density is too small to be stored."""

    @property
    def at_edge(self) -> bool:
        """Whether the density is highest at an end of the search: the lag may lie beyond it."""
        return bool(self.lags_d.size) and self.peak_d in {self.lags_d[0], self.lags_d[-1]}


def lag_posterior(
    t1_d: ArrayLike,
    flux1: ArrayLike,
    error1: ArrayLike,
    t2_d: ArrayLike,
    flux2: ArrayLike,
    error2: ArrayLike,
    lo_d: float,
    hi_d: float,
    belief: Belief,
    prior: Callable[[Floats], Floats] | None = None,
    telescope1: ArrayLike | None = None,
) -> LagPosterior:
    """Return the posterior density of the lag, everything else integrated out.

    The walk's timescale and rms enter as `walk_nodes` of the continuum's own posterior, the
    response as a sum over `belief.responses`, the scale by quadrature, the offsets analytically.
    A scan with the middle walk finds where the density matters and is refined until neighbours
    differ little there; the full sum is then worked out.

    Parameters
    ----------
    t1_d, flux1, error1 : array (n,), error may be one number
        Continuum. Any order; unusable epochs are left out.
    t2_d, flux2, error2 : array (m,)
        Line.
    lo_d, hi_d : float
        Range of lags, observed frame.
    belief : Belief
    prior : function or None
        Density of the lag's prior at an array of lags, unnormalised; None: flat.
    telescope1 : array (n,) or None
        Telescope of each continuum epoch; each has its own offset.

    Returns
    -------
    LagPosterior
        Always; data that allow no lag give NaN and the reason.
    """
    pair = make_pair(t1_d, flux1, error1, t2_d, flux2, error2, telescope1)
    reason = _refusal(pair, lo_d, hi_d)
    if reason:
        return _nothing(reason)
    walks, responses, scale = _settled(pair, belief)

    def mixture(lags: Floats, some: list[tuple[float, Factor]], related: bool = True) -> Floats:
        terms = [
            math.log(p * q)
            + line_given(pair, walk, lags, response, scale, belief.scale_dex, related)[0]
            for p, walk in some
            for q, response in responses
        ]
        return np.asarray(np.maximum(np.logaddexp.reduce(terms, axis=0), -1e100))

    middle, others = walks[len(walks) // 2 :][:1], walks[: len(walks) // 2]
    others = others + walks[len(walks) // 2 + 1 :]
    lags = _first_lags(pair, lo_d, hi_d)
    lags, scan = _refined(lags, mixture(lags, middle), lambda new: mixture(new, middle))
    log_density = scan
    if others:
        log_density = _completed(lags, scan, lambda chosen: mixture(chosen, others))
    lags, log_density = _refined(lags, log_density, lambda new: mixture(new, walks))
    apart = np.linspace(lo_d, hi_d, UNRELATED)
    alone = mixture(apart, walks, related=False)
    if prior is not None:
        log_density, alone = (
            value + _log(prior(at)) for value, at in ((log_density, lags), (alone, apart))
        )
    if not np.isfinite(log_density).any():
        return _nothing("no lag in the range searched is possible under the prior")
    log_odds = log_integral(lags, log_density) - log_integral(apart, alone)
    return _record(lags, log_density, log_odds)


def _log(density: Floats) -> Floats:
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(np.asarray(density, dtype=np.float64)))


def _refusal(pair: Pair, lo_d: float, hi_d: float) -> str:
    """Return why two light curves allow no lag, or nothing."""
    if not -math.inf < lo_d < hi_d < math.inf:
        return "the range of lags is empty"
    if min(pair.t1_d.size - pair.offsets.shape[1] + 1, pair.t2_d.size) < MIN_EPOCHS:
        return f"a light curve has fewer than {MIN_EPOCHS} usable epochs"
    with np.errstate(over="ignore", invalid="ignore"):
        if not (np.isfinite(pair.y1 @ pair.y1) and np.isfinite(pair.y2 @ pair.y2)):
            return "fluxes are too large to work with"
    if np.ptp(pair.t1_d) == 0.0 or np.ptp(pair.t2_d) == 0.0:
        return "all epochs of a light curve are at one time"
    if not (pair.e1.min() > 0.0 and pair.e2.min() > 0.0):
        return "a light curve does not vary at all"
    if np.ptp(pair.y1) == 0.0 or np.ptp(pair.y2) == 0.0:
        return "a light curve does not vary at all"
    shifted_lo, shifted_hi = pair.t2_d[0] - hi_d, pair.t2_d[-1] - lo_d
    if shifted_lo > pair.t1_d[-1] or shifted_hi < pair.t1_d[0]:
        return "the light curves overlap at no lag in the range searched"
    return ""


def _settled(
    pair: Pair, belief: Belief
) -> tuple[list[tuple[float, Factor]], list[tuple[float, Response]], float]:
    """Return weighted walks, weighted responses and the scale's median."""
    scatter1, scatter2 = float(pair.y1.std()), float(pair.y2.std())
    sigma = scatter1 if belief.sigma is None else belief.sigma
    scale = scatter2 / scatter1 if belief.scale is None else belief.scale
    walks = walk_nodes(pair, sigma, belief.sigma_dex, belief.tau_d, belief.tau_dex)
    count = len(belief.responses)
    weights = belief.weights or (1.0 / count,) * count
    return walks, list(zip(weights, belief.responses, strict=True)), scale


def _first_lags(pair: Pair, lo_d: float, hi_d: float) -> Floats:
    """Return the grid to begin with, half as wide as the continuum's epochs lie apart."""
    sampling = np.ptp(pair.t1_d) / pair.t1_d.size
    count = int(np.clip((hi_d - lo_d) / (0.5 * sampling), 40, MOST))
    return np.linspace(lo_d, hi_d, count + 1)


def _refined(
    lags: Floats, values: Floats, density: Callable[[Floats], Floats]
) -> tuple[Floats, Floats]:
    """Return a log density with lags put in where it is high and steep."""
    for _ in range(8):
        higher = np.maximum(values[1:], values[:-1])
        fall = values.max() - higher
        coarse = (fall < 0.5 * NEGLIGIBLE) & (np.abs(np.diff(values)) > np.maximum(STEEP, fall / 4))
        if not coarse.any():
            break
        new = 0.5 * (lags[1:] + lags[:-1])[coarse]
        lags, values = np.concatenate([lags, new]), np.concatenate([values, density(new)])
        order = np.argsort(lags)
        lags, values = lags[order], values[order]
    return lags, values


def _completed(lags: Floats, scan: Floats, others: Callable[[Floats], Floats]) -> Floats:
    """Return the log density of all walks from that of the middle one and of the others.

    The ratio of sum and part is smooth, so that where many lags matter it is worked out at some
    and interpolated.
    """
    matters = np.flatnonzero(scan > scan.max() - NEGLIGIBLE)
    stride = max(1, math.ceil(matters.size / FULL))
    chosen = np.union1d(matters[::stride], [int(np.argmax(scan)), int(matters[-1])])
    ratio = np.logaddexp(0.0, others(lags[chosen]) - scan[chosen])
    return np.asarray(scan + np.interp(lags, lags[chosen], ratio))


def _record(lags: Floats, log_density: Floats, log_odds: float) -> LagPosterior:
    """Return the posterior of a log density on a grid."""
    density = normalised(lags, log_density)
    lo, middle, hi = quantiles(lags, density, np.array([0.16, 0.5, 0.84]))
    top = int(np.argmax(density))
    found = peaks(lags, density)
    return LagPosterior(
        lag_d=float(middle),
        lag_lo_d=float(lo),
        lag_hi_d=float(hi),
        peak_d=float(lags[top]),
        primary_share=found[0].share,
        aliases=found,
        log_odds=log_odds,
        reason="",
        lags_d=lags,
        density=density,
        log_density=log_density - log_density[top] + math.log(density[top]),
    )


def _nothing(reason: str) -> LagPosterior:
    """Return the answer for data that allow no lag."""
    nan, none = math.nan, np.empty(0)
    return LagPosterior(nan, nan, nan, nan, 0.0, (), -math.inf, reason, none, none, none)
