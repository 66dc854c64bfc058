"""How the success of one layout depends on what is uncertain, from trials already made."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.model.plan import Sensitivity
from planner.scoring.intervals import Z_90_ONE_SIDED, wilson
from planner.scoring.logistic import Logistic, fit_logistic

__all__ = ["FEWEST_TRIALS", "Sensitivity", "reweighted", "sensitivities"]

FEWEST_TRIALS = 20
"""Fewer tell nothing of six coefficients."""
RIDGE = 0.25
"""A prior of standard deviation 2 on log odds per standard deviation of a factor: weak against
a few dozen trials."""
Z_90_CENTRAL = 1.6448536269514722
"""Normal quantile of 0.95: the interval between both ends holds with 90 % confidence."""
LEVELS = (
    ("lag", ("short", "median", "long")),
    ("amplitude", ("small", "median", "large")),
    ("timescale", ("short", "median", "long")),
    ("weather", ("bad", "median", "good")),
)


def sensitivities(
    success: NDArray[np.bool_],
    lag_z: NDArray[np.float64],
    amplitude_z: NDArray[np.float64],
    timescale_z: NDArray[np.float64],
    usable_nights: NDArray[np.float64],
) -> tuple[Sensitivity, ...]:
    """Return the success at three levels of each factor, from the outcomes of one layout's trials.

    A logistic regression on all factors at once, with the square of the lag's deviate since
    success peaks at the lags that cadence and season suit. A factor is then held at a percentile
    in every trial while the others stay as drawn, and the predictions are averaged (Robins 1986,
    Math. Modelling 7, 1393, from memory). The interval is by the delta method on the log odds of
    that average, with the chance of the other factors' draws added: a bootstrap costs hundreds of
    fits and random numbers, and fails where outcomes are all alike. It holds if the model does:
    success with a sharp edge in the lag is smoothed.

    Parameters
    ----------
    success : ndarray of bool, shape (n,)
    lag_z, amplitude_z, timescale_z : ndarray of float, shape (n,)
        The trials' standard normal deviates of the logarithms.
    usable_nights : ndarray of float, shape (n,)
        Of the layout's seasons.

    Returns
    -------
    tuple of Sensitivity
        Three levels of each factor in the order above; factors that were the same in every trial
        are left out, and all of them with fewer than `FEWEST_TRIALS` trials.
    """
    if success.size < FEWEST_TRIALS:
        return ()
    nights = np.asarray(usable_nights, dtype=float)
    spread = float(nights.std())
    scaled = (nights - nights.mean()) / (spread or 1.0)
    factors = np.column_stack([lag_z, amplitude_z, timescale_z, scaled]).astype(float)
    model = fit_logistic(_columns(factors), success, RIDGE)
    normal = np.array([-Z_90_ONE_SIDED, 0.0, Z_90_ONE_SIDED])
    percentiles = np.percentile(nights, [10, 50, 90])
    found = []
    for i, (factor, levels) in enumerate(LEVELS):
        if np.ptp(factors[:, i]) == 0:
            continue
        weather = factor == "weather"
        values = percentiles if weather else normal
        held_at = (percentiles - nights.mean()) / spread if weather else normal
        for level, value, at in zip(levels, values, held_at, strict=True):
            held = factors.copy()
            held[:, i] = at
            found.append(Sensitivity(factor, level, float(value), *_average(model, _columns(held))))
    return tuple(found)


def _columns(factors: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the columns of the regression: one, the factors, and the lag's square, centred."""
    return np.column_stack([np.ones(len(factors)), factors, factors[:, 0] ** 2 - 1])


def _average(model: Logistic, columns: NDArray[np.float64]) -> tuple[float, float, float]:
    """Return the average prediction and both ends of its interval."""
    each = model.predict(columns)
    mean = float(each.mean())
    slope = (each * (1 - each)) @ columns / each.size
    variance = slope @ model.covariance @ slope + each.var() / each.size
    half = Z_90_CENTRAL * np.sqrt(variance) / (mean * (1 - mean))
    odds = np.log(mean / (1 - mean))
    lo, hi = (float(1 / (1 + np.exp(-(odds + side * half)))) for side in (-1, 1))
    return mean, lo, hi


def reweighted(
    success: NDArray[np.bool_],
    lag_z: NDArray[np.float64],
    shift_dex: float,
    scatter_dex: float,
    new_scatter_dex: float,
) -> tuple[float, float, float, float]:
    """Return the success if the lag's log-normal prior had another median and scatter.

    Trials are weighted by the ratio of the new prior to the one they were drawn from, the weights
    normalised by their sum. Of the trials, as many count as would give the same error unweighted
    (Kish 1965, Survey Sampling, from memory): ``(sum w)**2 / sum w**2``, or what this is expected
    to be, ``n / E[w**2]``, if that is fewer, since the trials' own weights do not show a tail that
    none of them reached. A new scatter of sqrt(2) times the old, or wider, leaves none. The
    interval is Wilson's with the trials that count; both ends hold together with 90 % confidence.

    Parameters
    ----------
    success : ndarray of bool, shape (n,)
    lag_z : ndarray of float, shape (n,)
        The trials' standard normal deviates of the lag's logarithm.
    shift_dex : float
        New median over the old, in dex.
    scatter_dex, new_scatter_dex : float
        Old and new scatter.

    Returns
    -------
    success, lo, hi : float
        NaN where the priors overlap too little: if fewer than 15 trials, or less than a tenth of
        them, count.
    effective_trials : float
        The trials that count.

    Raises
    ------
    ValueError
        If a scatter is negative or a number is not finite.
    """
    if not np.all(np.isfinite([shift_dex, scatter_dex, new_scatter_dex])):
        raise ValueError("shift and scatters must be finite")
    if min(scatter_dex, new_scatter_dex) < 0:
        raise ValueError(f"scatters {scatter_dex} and {new_scatter_dex} must not be negative")
    n = success.size
    if shift_dex == 0 and new_scatter_dex == scatter_dex:
        weights, effective = np.ones(n), float(n)
    elif not n or 0 in (scatter_dex, new_scatter_dex):
        weights, effective = np.ones(n), 0.0
    else:
        shift, ratio = shift_dex / scatter_dex, new_scatter_dex / scatter_dex
        logs = lag_z**2 / 2 - ((lag_z - shift) / ratio) ** 2 / 2
        weights = np.exp(logs - logs.max())
        kish = float(weights.sum() ** 2 / (weights**2).sum())
        effective = min(kish, n / _mean_square(shift, ratio))
    if effective < max(15, n / 10):
        return np.nan, np.nan, np.nan, effective
    share = float(weights @ success / weights.sum())
    lo, hi = wilson(share * effective, effective, Z_90_CENTRAL)
    return share, float(lo), float(hi), effective


def _mean_square(shift: float, ratio: float) -> float:
    """Return the mean squared weight, N(shift, ratio^2) over N(0, 1), over draws of N(0, 1)."""
    left = 2 - ratio**2
    if left <= 0:
        return np.inf
    with np.errstate(over="ignore"):
        return float(np.exp(shift**2 / left) / (ratio * np.sqrt(left)))
