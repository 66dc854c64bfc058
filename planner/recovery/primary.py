"""The primary peak of a distribution of lags, and what lies outside it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["PrimaryPeak", "median_step", "overlap_weight", "primary_peak"]

Floats = NDArray[np.float64]

SMOOTHING = 0.025
"""Width of the smoothing (one sigma) over the duration of the campaign: 5 d in a season of 200 d,
15 d in 600 d, as has been used for campaigns of that length (Grier et al. 2017, ApJ 851, 21; 2019,
ApJ 887, 38; the numbers from memory)."""
GAP = 10.0
"""An interval longer than so many median intervals is a gap (our choice): across it, nothing is
known of the continuum."""
WEIGHT_POWER = 2.0
"""Of the overlap; Grier et al. 2017."""


@dataclass(frozen=True, slots=True)
class PrimaryPeak:
    """The tallest peak of a smoothed, weighted distribution of lags."""

    lo_d: float
    """Local minima of the distribution on either side, or the ends of the search."""
    hi_d: float
    share: float
    """Share of all (unweighted) lags between them."""
    others: tuple[tuple[float, float], ...]
    """Lag and share of every other peak that holds at least a twentieth, largest first."""
    rival: float
    """Height of the second tallest peak over that of this one; 0 if there is but one."""


def median_step(t_d: Floats) -> float:
    """Return the median interval of at least two ascending epochs, at a tenth of NumPy's cost."""
    steps = np.sort(np.diff(t_d))
    return float(0.5 * (steps[(steps.size - 1) // 2] + steps[steps.size // 2]))


def overlap_weight(t1_d: Floats, t2_d: Floats, lags_d: Floats) -> Floats:
    """Return how far data at each lag can be trusted: P = [N(lag) / N(0)]^2, at most 1.

    N is the number of epochs of curve 2 that, shifted back by the lag, fall where curve 1 was
    observed: inside its span and not in one of its gaps (Grier et al. 2017, ApJ 851, 21). Lags
    that bring one season under the gap of another get little weight.

    Parameters
    ----------
    t1_d, t2_d : array (n1,), (n2,)
        Strictly ascending.
    lags_d : array (k,)
    """
    if t1_d.size < 2 or t2_d.size == 0:
        return np.ones(lags_d.size)
    steps = np.diff(t1_d)
    gaps = np.flatnonzero(steps > GAP * median_step(t1_d))
    starts = np.concatenate([t1_d[:1], t1_d[gaps + 1]])
    ends = np.concatenate([t1_d[gaps], t1_d[-1:]])

    def covered(lags: Floats) -> Floats:
        inside = np.zeros(lags.size)
        for start, end in zip(starts, ends, strict=True):
            inside += np.searchsorted(t2_d, end + lags, side="right")
            inside -= np.searchsorted(t2_d, start + lags, side="left")
        return inside

    unshifted = covered(np.zeros(1))[0]
    share = np.minimum(covered(lags_d) / max(unshifted, 1.0), 1.0)
    return np.asarray(share**WEIGHT_POWER)


def primary_peak(lags_d: Floats, found_d: Floats, weight: Floats, duration_d: float) -> PrimaryPeak:
    """Return the primary peak of resampled lags.

    The lags, weighted, are smoothed with a Gaussian; the tallest peak between two local minima is
    the primary one. Lag and errors are then taken from the unweighted lags inside it (Grier et al.
    2017).

    Parameters
    ----------
    lags_d : array (k,)
        Searched lags, ascending, evenly spaced, at least two.
    found_d : array (b,)
        Resampled lags, at least one, inside the search.
    weight : array (k,)
        Of each searched lag.
    duration_d : float
        From the first epoch to the last.
    """
    weights = np.interp(found_d, lags_d, weight)
    if not weights.any():
        weights = np.ones(found_d.size)
    width = max(SMOOTHING * duration_d, float(lags_d[1] - lags_d[0]))
    away = lags_d[:, None] / width - found_d / width
    density = np.exp(-0.5 * np.square(away)) @ weights
    lows = 1 + np.flatnonzero((density[1:-1] <= density[:-2]) & (density[1:-1] < density[2:]))
    edges = np.concatenate([[0], lows, [lags_d.size - 1]])
    heights = np.maximum.reduceat(density, edges[:-1])
    main = int(np.argmax(heights))
    ordered = np.sort(found_d)
    shares = (
        np.searchsorted(ordered, lags_d[edges[1:]], side="right")
        - np.searchsorted(ordered, lags_d[edges[:-1]], side="left")
    ) / ordered.size
    others = [
        (float(lags_d[edges[i] + np.argmax(density[edges[i] : edges[i + 1]])]), float(shares[i]))
        for i in np.flatnonzero(shares >= 0.05)
        if i != main
    ]
    return PrimaryPeak(
        lo_d=float(lags_d[edges[main]]),
        hi_d=float(lags_d[edges[main + 1]]),
        share=float(shares[main]),
        others=tuple(sorted(others, key=lambda p: -p[1])),
        rival=float(np.delete(heights, main).max(initial=0.0) / heights[main]),
    )
