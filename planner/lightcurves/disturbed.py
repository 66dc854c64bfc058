"""Pairs of continuum and line that differ from what the recovery of lags takes for granted."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray
from scipy.fft import irfft, next_fast_len, rfft

from planner.kernels.ou_process import ou_path
from planner.lightcurves.driver import draw_pair
from planner.lightcurves.power_law import MEMORY, power_law_path
from planner.lightcurves.responses import longest_delay, response_weights
from planner.model.disturbance import Disturbance

__all__ = ["draw_disturbed_pair"]

Floats = NDArray[np.float64]

_STEP_D = 0.25
"""A quarter of the night from one epoch to the next."""
_STEPS = 24
"""Least steps in a lag and in a timescale."""
_NODES = 12_000
"""Most nodes of a grid; a longer one gets a coarser step."""
_SEASON_GAP_D = 60.0
"""Nights farther apart belong to different seasons."""


def draw_disturbed_pair(
    rng: np.random.Generator,
    t_continuum_d: Floats,
    t_line_d: Floats,
    tau_d: float,
    lag_d: float,
    width_d: float,
    disturbance: Disturbance,
) -> tuple[Floats, Floats]:
    """Draw the unit driver at the continuum's epochs and the disturbed response at the line's.

    Where neither the driver nor the response differs, this is `draw_pair`, deviate by deviate,
    so that the disturbed trial has the driver of the undisturbed one; the thin shell is
    `draw_pair` with a width of twice the lag. All else is drawn on an even grid, whose step is at
    most a 24th of the lag and of the timescale, for a power law also at most a quarter of a day;
    a coarser step is taken where that would need more than about 12000 nodes. The walk is exact
    at the continuum's epochs and at the nodes and straight between them in the line; a power
    law is straight between nodes in both. For the walk and for a slope of 3 the covariances
    are then wrong by less than 1e-3 of the driver's variance.

    Parameters
    ----------
    rng : numpy.random.Generator
        Stream of this trial's variability.
    t_continuum_d, t_line_d : array (n,), array (m,)
        Epochs, any order, ties allowed; days, observed frame.
    tau_d, lag_d, width_d : float
        As in `draw_pair`; a response other than the top hat does without the width.
    disturbance : Disturbance

    Returns
    -------
    x_continuum : array (n,)
        Unit variance.
    y_line : array (m,)

    Raises
    ------
    ValueError
        If the timescale is not positive or the width negative; on a grid, also if the response
        would start before its cause: the lag not positive, or the width above twice the lag.
    """
    t_continuum = np.asarray(t_continuum_d, dtype=np.float64)
    t_line = np.asarray(t_line_d, dtype=np.float64)
    random_walk = disturbance.driver_slope == 2.0
    if random_walk and disturbance.response == "top hat":
        x, y = draw_pair(rng, t_continuum, t_line, tau_d, lag_d, width_d)
    elif random_walk and disturbance.response == "shell":
        x, y = draw_pair(rng, t_continuum, t_line, tau_d, lag_d, 2.0 * lag_d)
    else:
        x, y = _on_grid(rng, t_continuum, t_line, tau_d, lag_d, width_d, disturbance)
    if disturbance.decoupled_share > 0.0:
        y = _stopped(rng, t_line, y, disturbance.decoupled_share)
    if disturbance.trend != 0.0 and y.size:
        y = y + _drift(rng, t_line, disturbance.trend)
    return x, y


def _on_grid(
    rng: np.random.Generator,
    t_continuum: Floats,
    t_line: Floats,
    tau: float,
    lag: float,
    width: float,
    disturbance: Disturbance,
) -> tuple[Floats, Floats]:
    """Draw any driver on an even grid and let any response answer it."""
    if not tau > 0.0:
        raise ValueError(f"need tau_d > 0, got {tau}")
    epochs = np.concatenate([t_continuum, t_line])
    if epochs.size == 0:
        return t_continuum, t_line
    span = float(np.ptp(epochs))
    power_law = disturbance.driver_slope != 2.0
    length = span + longest_delay(disturbance.response, lag, width) + power_law * MEMORY * tau
    step = min(lag / _STEPS, tau / _STEPS, _STEP_D if power_law else math.inf)
    step = max(step, length / _NODES)
    weights = response_weights(disturbance.response, lag, width, step)
    # As many nodes before the first epoch as the response has weights: its answer is complete.
    grid = epochs.min() + step * np.arange(-weights.size, math.ceil(span / step) + 2)
    if power_law:
        driver = power_law_path(rng, grid.size, step, tau, disturbance.driver_slope)
        x = np.interp(t_continuum, grid, driver)
    else:
        driver, x = _walk(rng, grid, t_continuum, tau)
    return x, np.interp(t_line, grid, _answer(driver, weights))


def _walk(
    rng: np.random.Generator, grid: Floats, epochs: Floats, tau: float
) -> tuple[Floats, Floats]:
    """Return one damped random walk at the nodes and at the epochs."""
    t = np.concatenate([grid, epochs])
    order = np.argsort(t, kind="stable")
    x = np.empty(t.size)
    x[order], _ = ou_path(t[order], float(tau), rng.standard_normal((t.size, 2)))
    return x[: grid.size], x[grid.size :]


def _answer(driver: Floats, weights: Floats) -> Floats:
    """Return the driver's weighted past at each node; wrong at the first ``weights.size - 1``."""
    size = next_fast_len(driver.size, real=True)
    product = rfft(driver, size) * rfft(weights, size)
    return np.asarray(irfft(product, size)[: driver.size])


def _stopped(rng: np.random.Generator, t: Floats, y: Floats, share: float) -> Floats:
    """Let the line keep its value for one stretch of each season, wherever in it."""
    order = np.argsort(t, kind="stable")
    seasons = np.split(order, np.flatnonzero(np.diff(t[order]) > _SEASON_GAP_D) + 1)
    kept = y.copy()
    for season in seasons:
        if season.size == 0:
            continue
        first, length = t[season[0]], np.ptp(t[season])
        start = first + rng.uniform(0.0, 1.0 - share) * length
        still = season[(t[season] >= start) & (t[season] <= start + share * length)]
        if still.size:
            kept[still] = y[still[0]]
    return kept


def _drift(rng: np.random.Generator, t: Floats, change: float) -> Floats:
    """Return a straight line of zero middle, rising or falling by the change."""
    span = np.ptp(t)
    sign = 1.0 if rng.uniform() < 0.5 else -1.0
    place = (t - t.min()) / span - 0.5 if span > 0.0 else np.zeros_like(t)
    return np.asarray(sign * change * place)
