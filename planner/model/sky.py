"""Nights and windows at one site."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

__all__ = ["NightState", "Nights", "Season", "Windows"]


class NightState(IntEnum):
    """What kind of night it is."""

    NONE = 0
    """The sun never gets below the limit."""
    ORDINARY = 1
    """Dusk and dawn."""
    ALWAYS = 2
    """The sun stays below the limit from local noon to local noon."""


@dataclass(frozen=True, slots=True)
class Nights:
    """Every night of a campaign at one site; arrays of shape (nights,).

    A night runs from local mean solar noon to the next and is named by the evening's date, here
    as the integer MJD of that date.
    """

    site: str
    night: NDArray[np.int64]
    noon_mjd: NDArray[np.float64]
    """UTC at which the night's 24 hours begin."""
    state: NDArray[np.int8]
    """`NightState` of each night."""
    dark_start_mjd: NDArray[np.float64]
    """UTC; NaN where there is no night."""
    dark_end_mjd: NDArray[np.float64]
    moon_illumination: NDArray[np.float64]
    """Illuminated fraction at local midnight."""
    moon_up_fraction: NDArray[np.float64]
    """Share of the dark time with the moon above the horizon; 0 where there is no night."""


@dataclass(frozen=True, slots=True)
class Windows:
    """All windows of a list of targets at one site; arrays of shape (windows,).

    A night may hold several windows of one target (before and after an exclusion), listed in time
    order; rows are sorted by target, then time.
    """

    site: str
    target: NDArray[np.int32]
    """Index into the list of targets."""
    night: NDArray[np.int32]
    """Index into `Nights`."""
    start_mjd: NDArray[np.float64]
    end_mjd: NDArray[np.float64]
    best_mjd: NDArray[np.float64]
    """Time of least airmass inside the window."""
    airmass_min: NDArray[np.float64]
    moon_separation_deg: NDArray[np.float64]
    """At `best_mjd`."""
    moon_altitude_deg: NDArray[np.float64]
    """At `best_mjd`."""
    moon_illumination: NDArray[np.float64]
    """Illuminated fraction at `best_mjd`."""


@dataclass(frozen=True, slots=True)
class Season:
    """A run of nights with windows of one target; indices into `Nights`, both inclusive."""

    target: int
    first: int
    last: int
    nights: int
    """Nights with a window."""
    gap_after_nights: int
    """Nights without a window until the next season or the campaign's end."""
