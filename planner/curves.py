"""Light curves of one's own: correlate, resample, posterior, forecast, recover.

Times may be plain numbers in days, quantities with a unit, or `astropy.time.Time`; fluxes and
errors plain numbers in any one unit. What comes back is in observed-frame days.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.base.seeds import stream
from planner.model.campaign import SuccessRule
from planner.recovery import (
    Belief,
    FisherForecast,
    LagPosterior,
    LagResult,
    Response,
    correlation,
    fisher_forecast,
    lag_posterior,
    make_design,
    recover_lag,
)
from planner.scoring import Curves, OwnRecovery, recover_own

__all__ = ["correlate", "forecast", "posterior", "recover", "resample"]

Floats = NDArray[np.float64]


def _days(time: Any) -> Floats:
    """Return times or lags in days."""
    if hasattr(time, "mjd"):
        return np.asarray(time.mjd, dtype=np.float64)
    if hasattr(time, "to_value"):
        return np.asarray(time.to_value("d"), dtype=np.float64)
    return np.asarray(time, dtype=np.float64)


def correlate(time1: Any, flux1: ArrayLike, time2: Any, flux2: ArrayLike, lags: Any) -> Floats:
    """Return the interpolated cross-correlation of continuum and line at each lag, (k,).

    NaN where too few epochs overlap. Raises ValueError unless the lags are ascending and even.
    """
    return correlation(_days(time1), flux1, _days(time2), flux2, _days(lags))


def resample(
    time1: Any,
    flux1: ArrayLike,
    error1: ArrayLike,
    time2: Any,
    flux2: ArrayLike,
    error2: ArrayLike,
    lags: Any,
    *,
    resamples: int = 1000,
    seed: int = 1,
    detrend: bool = False,
) -> LagResult:
    """Return the lag by flux randomisation and random subset selection; see `recover_lag`."""
    return recover_lag(
        _days(time1),
        flux1,
        error1,
        _days(time2),
        flux2,
        error2,
        _days(lags),
        resamples,
        stream(seed, "resample"),
        detrend=detrend,
    )


def posterior(
    time1: Any,
    flux1: ArrayLike,
    error1: ArrayLike,
    time2: Any,
    flux2: ArrayLike,
    error2: ArrayLike,
    lowest: Any,
    highest: Any,
    timescale: Any,
    timescale_scatter_dex: float = 0.35,
) -> LagPosterior:
    """Return the posterior density of the lag between `lowest` and `highest`; see `lag_posterior`.

    `timescale` is the damping timescale expected of the continuum, observed frame.
    """
    return lag_posterior(
        _days(time1),
        flux1,
        error1,
        _days(time2),
        flux2,
        error2,
        float(_days(lowest)),
        float(_days(highest)),
        Belief(float(_days(timescale)), timescale_scatter_dex),
    )


def forecast(
    time1: Any,
    error1: ArrayLike,
    time2: Any,
    error2: ArrayLike,
    lag: Any,
    rms: float,
    timescale: Any,
    scale: float = 1.0,
) -> FisherForecast:
    """Return the least error with which epochs like these can give a lag; see `fisher_forecast`.

    `rms` is that of the continuum in its flux unit, `scale` the line's flux per continuum flux;
    the response is a top hat as wide as the lag.
    """
    return fisher_forecast(
        make_design(
            _days(time1),
            error1,
            _days(time2),
            error2,
            float(_days(lag)),
            rms,
            float(_days(timescale)),
            scale,
            Response("top_hat", 1.0),
        )
    )


def recover(
    time1: Any,
    flux1: ArrayLike,
    error1: ArrayLike,
    time2: Any,
    flux2: ArrayLike,
    error2: ArrayLike,
    rule: SuccessRule,
    *,
    seed: int = 1,
    detrend: bool = False,
) -> OwnRecovery:
    """Return what every method makes of two light curves, and which lags pass the rule's cuts."""
    curves = Curves(
        *_columns(time1, flux1, error1),
        *_columns(time2, flux2, error2),
    )
    return recover_own(curves, rule, seed, detrend=detrend)


def _columns(time: Any, flux: ArrayLike, error: ArrayLike) -> tuple[Floats, Floats, Floats]:
    t, f, e = np.broadcast_arrays(
        np.atleast_1d(_days(time)), np.asarray(flux, float), np.asarray(error, float)
    )
    return t, f, e
