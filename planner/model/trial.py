"""What trials are made from, what comes out of them, and what they say of a layout."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.sky import Season
from planner.model.target import Forecast

__all__ = ["Outcome", "Prospect", "Score", "StreamNights", "TrialTable"]


@dataclass(frozen=True, slots=True)
class StreamNights:
    """The nights on which one target can be visited in one stream; arrays of shape (nights,).

    Only nights with a window that holds a whole visit are listed, in time order.
    """

    site: str
    night: NDArray[np.int64]
    """Nights since the campaign's first."""
    window_start_mjd: NDArray[np.float64]
    window_end_mjd: NDArray[np.float64]
    best_mjd: NDArray[np.float64]
    """Middle of a visit as near to the least airmass as the window allows."""
    airmass: NDArray[np.float64]
    """At `best_mjd`."""
    moon_separation_deg: NDArray[np.float64]
    flux_error: NDArray[np.float64]
    """Fractional error of the flux of one visit."""
    visit_s: float
    """Exposure, read-out and slew."""


@dataclass(frozen=True, slots=True)
class Prospect:
    """One target as its trials see it."""

    forecast: Forecast
    line: StreamNights
    continuum: StreamNights
    seasons: tuple[Season, ...]


@dataclass(frozen=True, slots=True)
class Outcome:
    """What one trial of one layout came to. Lags in the observed frame; NaN: no lag."""

    lag_true_d: float
    lag_d: float
    lag_lo_d: float
    lag_hi_d: float
    r_max: float
    epochs_line: int
    epochs_continuum: int
    claim: bool
    success: bool
    reason: str
    """Why there is no claim, or why a claim is wrong; empty for a success."""


@dataclass(frozen=True, slots=True)
class TrialTable:
    """Outcomes of every layout of one target; arrays of shape (layouts, trials)."""

    target: str
    layouts: tuple[Layout, ...]
    lag_true_d: NDArray[np.float64]
    lag_d: NDArray[np.float64]
    lag_lo_d: NDArray[np.float64]
    lag_hi_d: NDArray[np.float64]
    r_max: NDArray[np.float64]
    epochs_line: NDArray[np.int64]
    epochs_continuum: NDArray[np.int64]
    claim: NDArray[np.bool_]
    success: NDArray[np.bool_]
    reason: NDArray[np.int8]
    """Index into `planner.scoring.REASONS`."""


@dataclass(frozen=True, slots=True)
class Score:
    """What the trials say of one layout of one target."""

    target: str
    layout: Layout
    epochs_line: float
    epochs_continuum: float
    success: float
    success_lo: float
    success_hi: float
    claims: float
    false_claims: float
    false_claims_lo: float
    false_claims_hi: float
    hours: float
    hours_line: float
    trials: int
    note: str
    """Why the layout could not be tried as it stands, or in what it was cut short; else empty."""
