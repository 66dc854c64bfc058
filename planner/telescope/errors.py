"""Flux errors of one visit, scaled from one known signal-to-noise.

At the reference (magnitude, exposure, airmass) the target gives S counts and everything else (sky,
read-out) a noise variance of B counts, a share f = B / (S + B) of the whole, so that

    S = SNR^2 / (1 - f),    B = S f / (1 - f).

S scales with brightness, atmospheric extinction and time, B with time alone. Read-out noise does
not grow with time in truth; it is small in the exposures of several minutes that are usual here.
Every error has a calibration floor, added in quadrature, that no exposure beats.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.model.observatory import Instrument

__all__ = ["flux_error", "line_flux_error"]

LIGHT_KM_S = 299792.458
WINDOW_WIDTHS = 2.5
"""Width over which a line is integrated, in full widths at half maximum: 99.7 % of a Gaussian."""


def flux_error(
    instrument: Instrument, magnitude_mag: ArrayLike, exposure_s: float, airmass: ArrayLike
) -> NDArray[np.float64]:
    """Return the fractional error of the flux in a band.

    Parameters
    ----------
    instrument : Instrument
        Of the continuum stream; its signal-to-noise is that of the flux in the band.
    magnitude_mag : array_like
        AGN and host together, in the instrument's band; broadcast with `airmass`.
    exposure_s : float
        Above 0.
    airmass : array_like
        Shape (n,), or a number.

    Returns
    -------
    (n,) float64
        Standard deviation over flux, the floor included.
    """
    source, other = _counts(instrument, magnitude_mag, exposure_s, airmass)
    return np.hypot(np.sqrt(source + other) / source, instrument.floor)


def line_flux_error(
    instrument: Instrument,
    magnitude_mag: ArrayLike,
    exposure_s: float,
    airmass: ArrayLike,
    equivalent_width_obs_a: float,
    line_width_km_s: float,
    wavelength_obs_a: float,
) -> NDArray[np.float64]:
    """Return the fractional error of a broad line's flux.

    Parameters
    ----------
    instrument : Instrument
        Of the line stream; its signal-to-noise is that of the continuum (AGN and host) per
        observed angstrom next to the line.
    magnitude_mag, exposure_s, airmass
        As for `flux_error`.
    equivalent_width_obs_a : float
        Observed frame, angstrom: rest frame times (1 + z); over AGN and host together.
    line_width_km_s : float
        Full width at half maximum.
    wavelength_obs_a : float
        Observed wavelength of the line, angstrom.

    Returns
    -------
    (n,) float64
        Standard deviation over flux, the floor included.

    Notes
    -----
    With S and B per angstrom, EW the equivalent width and D = 2.5 FWHM the window: the line gives
    EW S counts; the window's noise variance is EW S + D (S + B); the continuum below the line,
    measured beside it over windows of total width D, adds D (S + B) once more.
    """
    source, other = _counts(instrument, magnitude_mag, exposure_s, airmass)
    window_a = WINDOW_WIDTHS * line_width_km_s / LIGHT_KM_S * wavelength_obs_a
    line = equivalent_width_obs_a * source
    variance = line + 2 * window_a * (source + other)
    return np.hypot(np.sqrt(variance) / line, instrument.floor)


def _counts(
    instrument: Instrument, magnitude_mag: ArrayLike, exposure_s: float, airmass: ArrayLike
) -> tuple[NDArray[np.float64], float]:
    """Return the target's counts, shape (n,), and the other noise variance in counts."""
    share = instrument.sky_share
    reference = instrument.signal_to_noise**2 / (1 - share)
    time = exposure_s / instrument.reference_s
    dimming_mag = (
        np.asarray(magnitude_mag, dtype=np.float64)
        - instrument.reference_mag
        + instrument.extinction_mag
        * (np.asarray(airmass, dtype=np.float64) - instrument.reference_airmass)
    )
    source = reference * time * 10.0 ** (-0.4 * dimming_mag)
    return source, reference * share / (1 - share) * time
