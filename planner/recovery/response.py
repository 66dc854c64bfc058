"""How the line answers the continuum: response functions and their covariances."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.kernels import joint_response

__all__ = ["Response", "cross_covariance", "line_covariance"]

Floats = NDArray[np.float64]

_CODES = {"top_hat": 0, "shell": 0, "gaussian": 1, "ring": 2}


@dataclass(frozen=True, slots=True)
class Response:
    """A response function of unit area whose mean delay is the lag.

    Standard transfer functions of the geometries of Blandford & McKee (1982, ApJ 255,
    419): a thin spherical shell that emits isotropically answers evenly
    between 0 and twice the lag; a thin ring at inclination i with delays
    ``lag (1 + sin i cos phi)``, phi uniform.
    """

    shape: Literal["top_hat", "gaussian", "shell", "ring"] = "top_hat"
    width: float = 0.0
    """As a share of the lag, >= 0. Top hat: full width; Gaussian: standard deviation; ring: sin i;
    shell: without meaning. 0 is a sharp response."""

    def __post_init__(self) -> None:
        """Refuse unknown shapes and impossible widths with a ValueError."""
        if self.shape not in _CODES:
            raise ValueError(f"unknown shape {self.shape!r}; known: {', '.join(_CODES)}")
        if not 0.0 <= self.width < np.inf or (self.shape == "ring" and self.width > 1.0):
            raise ValueError(f"a {self.shape} of width {self.width} is impossible")

    @property
    def code(self) -> int:
        """The kernel's number of the shape."""
        return _CODES[self.shape]

    def widths_d(self, lags_d: Floats) -> Floats:
        """Return the width in days for each lag; that of a negative lag is its mirror image's."""
        share = 2.0 if self.shape == "shell" else self.width
        return np.asarray(share * np.abs(lags_d), dtype=np.float64)


def cross_covariance(
    t1_d: ArrayLike, t2_d: ArrayLike, lags_d: ArrayLike, tau_d: float, response: Response
) -> Floats:
    """Return the covariance of a unit damped random walk with its response, for each lag.

    Closed forms for the top hat, shell and Gaussian, a split Gauss-Legendre quadrature for the
    ring, of ``exp(-|dt| / tau)`` integrated over the response.

    Parameters
    ----------
    t1_d : array (n,)
        Times of the walk, ascending; days.
    t2_d : array (m,)
        Times of the response, ascending.
    lags_d : array (k,)
        Trial lags.
    tau_d : float
        Damping timescale, > 0.
    response : Response

    Returns
    -------
    array (k, n, m)
    """
    lags = np.atleast_1d(np.asarray(lags_d, dtype=np.float64))
    return np.asarray(
        joint_response.cross_covariance(
            response.code, _times(t1_d), _times(t2_d), lags, response.widths_d(lags), float(tau_d)
        )
    )


def line_covariance(t2_d: ArrayLike, lags_d: ArrayLike, tau_d: float, response: Response) -> Floats:
    """Return the response's covariance with itself, (k, m, m); see `cross_covariance`."""
    lags = np.atleast_1d(np.asarray(lags_d, dtype=np.float64))
    return np.asarray(
        joint_response.line_covariance(
            response.code, _times(t2_d), response.widths_d(lags), float(tau_d)
        )
    )


def _times(t_d: ArrayLike) -> Floats:
    """Return times as the kernel wants them."""
    return np.ascontiguousarray(np.atleast_1d(t_d), dtype=np.float64)
