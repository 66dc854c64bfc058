"""Light curves of several telescopes put on the scale of the first."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

__all__ = ["joined"]

Floats = NDArray[np.float64]
Measured = tuple[Floats, Floats, Floats]
"""Times in days, fluxes, errors."""

FEWEST = 4
"""Fewest common epochs on which to fit a scale; below, only the means are made equal."""


def joined(curves: Sequence[Measured]) -> Measured:
    """Join light curves whose scales and offsets are not known relative to each other.

    Each curve after the first is brought to the scale of the first by a straight line, fitted to
    its fluxes against those of the first curve interpolated to its epochs, errors in both taken
    into account (Deming regression; the interpolation's own error is left out). The fit spends
    real information: what the curves have in common no longer tells them apart.

    Parameters
    ----------
    curves : sequence of (times, fluxes, errors)
        Each in time order; the first is the reference. Empty curves are left out.

    Returns
    -------
    times, fluxes, errors : arrays (n,)
        All epochs, in time order.
    """
    kept = [curve for curve in curves if curve[0].size]
    if not kept:
        return curves[0]
    parts = [kept[0], *(_scaled(kept[0], other) for other in kept[1:])]
    t, flux, error = (np.concatenate(column) for column in zip(*parts, strict=True))
    order = np.argsort(t, kind="stable")
    return t[order], flux[order], error[order]


def _scaled(reference: Measured, other: Measured) -> Measured:
    """Return `other` on the scale of `reference`."""
    t, flux, error = other
    common = (t >= reference[0][0]) & (t <= reference[0][-1])
    expected = np.interp(t[common], reference[0], reference[1])
    if np.count_nonzero(common) < FEWEST:
        return t, flux - flux.mean() + reference[1].mean(), error
    scale = _slope(expected, flux[common], reference[2], error[common])
    offset = flux[common].mean() - scale * expected.mean()
    return t, (flux - offset) / scale, error / scale


def _slope(x: Floats, y: Floats, x_error: Floats, y_error: Floats) -> float:
    """Return the slope of a line through points with errors in both directions."""
    ratio = float(np.mean(y_error**2) / np.mean(x_error**2))
    xx, yy = float(np.var(x)), float(np.var(y))
    xy = float(np.mean((x - x.mean()) * (y - y.mean())))
    if not xy > 0.0:
        return 1.0
    excess = yy - ratio * xx
    return (excess + float(np.sqrt(excess**2 + 4.0 * ratio * xy**2))) / (2.0 * xy)
