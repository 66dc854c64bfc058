"""Light curves made ready for the kernels: finite, in time order, one flux at each time."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["Curve", "tidy_pair"]

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Curve:
    """Arrays of shape (n,), strictly ascending in time."""

    t_d: Floats
    flux: Floats
    error: Floats

    def without_trend(self) -> Curve:
        """Return the curve less the straight line that fits it best; too few epochs stay."""
        if self.t_d.size < 3:
            return self
        sigma = np.where(self.error > 0.0, self.error, 1.0) if self.error.any() else 1.0
        line = np.polynomial.Polynomial.fit(
            self.t_d, self.flux, 1, w=1.0 / np.broadcast_to(sigma, self.t_d.shape)
        )
        return Curve(self.t_d, self.flux - line(self.t_d), self.error)


def tidy_pair(
    t1_d: ArrayLike,
    flux1: ArrayLike,
    error1: ArrayLike,
    t2_d: ArrayLike,
    flux2: ArrayLike,
    error2: ArrayLike,
) -> tuple[Curve, Curve]:
    """Return the usable epochs of two light curves, counted from the earliest time of both.

    Parameters
    ----------
    t1_d, flux1, t2_d, flux2 : array (n1,), (n2,)
        Any order, ties allowed.
    error1, error2 : array or float
        One-sigma errors. Epochs with a non-finite value or a negative error are left out.

    Returns
    -------
    two `Curve`
        Epochs at one and the same time are replaced by their plain mean, its error by
        ``sqrt(sum(error^2)) / count``. A zero point near the data keeps differences of times
        free of the rounding of large dates.
    """
    one, two = _usable(t1_d, flux1, error1), _usable(t2_d, flux2, error2)
    zero_d = min((float(t.min()) for t, _, _ in (one, two) if t.size), default=0.0)
    return _merged(*one, zero_d), _merged(*two, zero_d)


def _usable(t_d: ArrayLike, flux: ArrayLike, error: ArrayLike) -> tuple[Floats, Floats, Floats]:
    """Return the finite epochs."""
    t, f, e = (np.asarray(a, dtype=np.float64) for a in (t_d, flux, error))
    if not t.shape == f.shape == e.shape or t.ndim != 1:
        t, f, e = np.broadcast_arrays(*map(np.atleast_1d, (t, f, e)))
    usable = np.isfinite(t) & np.isfinite(f) & np.isfinite(e) & (e >= 0.0)
    return t[usable], f[usable], e[usable]


def _merged(t: Floats, f: Floats, e: Floats, zero_d: float) -> Curve:
    """Return one epoch at each time, ascending."""
    if np.all(t[1:] > t[:-1]):
        return Curve(t - zero_d, f, e)
    times, place, count = np.unique(t, return_inverse=True, return_counts=True)
    mean = np.bincount(place, f, times.size) / count
    return Curve(times - zero_d, mean, np.sqrt(np.bincount(place, e * e, times.size)) / count)
