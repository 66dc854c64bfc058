"""What trials are made from, what comes out of them, and what they say of a layout."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.sky import Season
from planner.model.target import Forecast

__all__ = ["FeedNights", "Offer", "Prospect", "Score", "TrialTable"]


@dataclass(frozen=True, slots=True)
class FeedNights:
    """The nights on which one telescope can visit one target in one stream; arrays (nights,).

    Only nights with a window that holds a whole visit are listed, in time order.
    """

    telescope: str
    site: str
    in_spectra_of: int | None
    """Continuum: number of the line's telescope in whose spectra it is measured; None: visits of
    its own."""
    night: NDArray[np.int64]
    """Nights since the campaign's first."""
    window_start_mjd: NDArray[np.float64]
    window_end_mjd: NDArray[np.float64]
    best_mjd: NDArray[np.float64]
    """Middle of a visit at the time of the window that gives the smallest error."""
    airmass: NDArray[np.float64]
    """At `best_mjd`, as what follows."""
    sky_ab_mag: NDArray[np.float64]
    """Sky brightness per square arcsec, AB, at the stream's wavelength."""
    flux_error: NDArray[np.float64]
    """Fractional error of the flux of one visit, the calibration's included."""
    scale_error: float
    """Part of `flux_error` that all that is measured in one spectrum has in common; 0 in images."""
    signal_to_noise: NDArray[np.float64]
    """Of the band's flux, or of the spectrum's continuum per pixel or angstrom."""
    exposure_s: float
    visit_s: float
    """Slew, acquisition, exposure, read-out and overhead."""
    standards_s: float
    """Spent once a night."""
    most_visits: int
    """Visits that the time granted on the telescope, and to the stream, pays for."""
    reached: bool
    """False: even the longest exposure does not give the wanted error."""


@dataclass(frozen=True, slots=True)
class Prospect:
    """One target as its trials see it."""

    forecast: Forecast
    line: tuple[FeedNights, ...]
    """By telescope, the main one first."""
    continuum: tuple[FeedNights, ...]
    seasons: tuple[Season, ...]
    note: str
    """Why there is no season; else empty."""


@dataclass(frozen=True, slots=True)
class Offer:
    """One target's candidate layouts, and the target as each of them sees it."""

    layouts: tuple[Layout, ...]
    prospects: tuple[tuple[tuple[float, float], Prospect], ...]
    """By the factors of line and continuum exposures; the first with exposures as they are."""

    @property
    def target(self) -> str:
        """Return the target's name."""
        return self.plain.forecast.name

    @property
    def plain(self) -> Prospect:
        """Return the target with exposures as they are."""
        return self.prospects[0][1]

    def prospect(self, layout: Layout) -> Prospect:
        """Return the target as one of the layouts sees it."""
        return next(p for exposures, p in self.prospects if exposures == layout.exposures)


@dataclass(frozen=True, slots=True)
class TrialTable:
    """Outcomes of every layout of one target; arrays of shape (layouts, trials).

    Layouts may have had other numbers of trials: of each, the first ones are filled; beyond them
    floats are NaN, counts 0 and outcomes False.
    """

    target: str
    layouts: tuple[Layout, ...]
    trials: NDArray[np.int64]
    """Trials of each layout, (layouts,)."""
    most: int
    """Most trials a layout might have had, where they raced; 0: the number was fixed."""
    lag_true_d: NDArray[np.float64]
    lag_d: NDArray[np.float64]
    lag_lo_d: NDArray[np.float64]
    lag_hi_d: NDArray[np.float64]
    r_max: NDArray[np.float64]
    epochs_line: NDArray[np.int64]
    epochs_continuum: NDArray[np.int64]
    hours: NDArray[np.float64]
    """Clock hours of both streams."""
    hours_line: NDArray[np.float64]
    hours_shutter: NDArray[np.float64]
    claim: NDArray[np.bool_]
    success: NDArray[np.bool_]
    reason: NDArray[np.int8]
    """Index into `planner.scoring.REASONS`."""


@dataclass(frozen=True, slots=True)
class Score:
    """What the trials say of one layout of one target."""

    target: str
    layout: Layout
    promise: float
    """Success that the information forecast expects; NaN where none was made."""
    epochs_line: float
    epochs_continuum: float
    success: float
    """NaN without trials."""
    success_lo: float
    success_hi: float
    claims: float
    false_claims: float
    false_claims_lo: float
    false_claims_hi: float
    hours: float
    """Clock hours of both streams."""
    hours_line: float
    hours_shutter: float
    """Exposures alone, both streams."""
    trials: int
    note: str
    """Why the layout was not tried, or in what it was cut short; else empty."""
    added: bool = False
    """Looked at between the candidates."""
