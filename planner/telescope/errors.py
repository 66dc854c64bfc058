"""Fractional flux errors of one epoch."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.model.observatory import Camera, Feed, LineMeasurement, Spectrograph, Telescope
from planner.telescope.conditions import Conditions, Floats
from planner.telescope.imaging import camera_rates
from planner.telescope.known_case import known_rates
from planner.telescope.rates import Rates, variance_e2
from planner.telescope.spectra import spectrograph_rates

__all__ = ["image_error", "line_error", "signal_to_noise", "spectral_continuum_error"]

LIGHT_KM_S = 299792.458
WINDOW_WIDTHS = 2.5
"""Width over which a line is integrated, in full widths at half maximum: 99.7 % of a Gaussian."""
NARROW_KM_S = 400.0
"""Full width at half maximum of narrow lines (typical of [O III]; from memory)."""


def image_error(
    feed: Feed,
    telescope: Telescope,
    magnitude: Floats,
    exposure_s: Floats,
    conditions: Conditions,
) -> NDArray[np.float64]:
    """Return the fractional error of the flux in a band.

    Parameters
    ----------
    feed : Feed
        Its instrument is a `Camera` or a `KnownCase`; its exposures share `exposure_s`.
    telescope : Telescope
        What the instrument hangs on.
    magnitude
        AGN and host together, in the instrument's band and that band's own system.
    exposure_s
        Shutter time, above 0.
    conditions : Conditions
        At the band's pivot wavelength.

    Returns
    -------
    ndarray
        Standard deviation over flux, of the broadcast shape: photons, comparison stars (their
        whole noise, if the camera gives their magnitude) and floor in quadrature.
    """
    rates = _rates(feed, telescope, magnitude, conditions, None)
    variance = _fraction(rates, exposure_s, feed.exposures) ** 2
    camera = feed.instrument
    if isinstance(camera, Camera) and camera.comparison_mag is not None:
        star = camera_rates(camera, telescope, camera.comparison_mag, conditions)
        variance = variance + (
            _fraction(star, exposure_s, feed.exposures) ** 2 / camera.comparison_stars
        )
    return np.asarray(np.sqrt(variance + feed.floor**2))


def line_error(
    feed: Feed,
    telescope: Telescope,
    measurement: LineMeasurement,
    magnitude: Floats,
    exposure_s: Floats,
    conditions: Conditions,
    equivalent_width_obs_a: float,
    line_width_km_s: float,
    wavelength_obs_a: float,
    redshift: float,
) -> NDArray[np.float64]:
    """Return the fractional error of a broad line's flux.

    Parameters
    ----------
    feed : Feed
        Its instrument is a `Spectrograph` or a `KnownCase`; its exposures share `exposure_s`.
    telescope : Telescope
        What the instrument hangs on.
    measurement : LineMeasurement
        Windows and narrow lines; rest frame.
    magnitude
        AGN and host together: for a `Spectrograph` the AB magnitude of the continuum at
        `wavelength_obs_a`, for a `KnownCase` in its band and that band's own system.
    exposure_s
        Shutter time, above 0.
    conditions : Conditions
        At `wavelength_obs_a`.
    equivalent_width_obs_a : float
        Observed frame, angstrom: rest frame times (1 + z); over AGN and host together.
    line_width_km_s : float
        Full width at half maximum.
    wavelength_obs_a : float
        Observed wavelength of the line, angstrom.
    redshift : float
        Of the target.

    Returns
    -------
    ndarray
        Standard deviation over flux, of the broadcast shape: photons of the line, of the narrow
        lines if the spectra are scaled with them, and floor in quadrature.

    Notes
    -----
    With S and v the electrons and the noise variance of an angstrom of continuum, W the line's
    equivalent width, D = 2.5 FWHM its window and C the width of the windows beside it, the line
    gives W S electrons and the variance is W S + D v + D^2 v / C; the last term is the error of
    the continuum below the line. The narrow lines are treated alike, at the broad line's
    wavelength and without the broad line's light below them.
    """
    rates = _rates(feed, telescope, magnitude, conditions, wavelength_obs_a)
    instrument = feed.instrument
    resolution_a = instrument.resolution_a if isinstance(instrument, Spectrograph) else 0.0
    beside_a = measurement.continuum_window_a

    def fraction(width_obs_a: float, speed_km_s: float) -> Floats:
        """Return the photon error of a line of this equivalent width and FWHM."""
        window_a = WINDOW_WIDTHS * np.hypot(
            resolution_a, speed_km_s / LIGHT_KM_S * wavelength_obs_a
        )
        windows = window_a + (
            window_a if beside_a is None else window_a**2 / (beside_a * (1.0 + redshift))
        )
        line = width_obs_a * rates.source_e_s * exposure_s
        variance = line + windows * variance_e2(rates, exposure_s, feed.exposures)
        noise: Floats = np.sqrt(variance)
        return noise / line

    variance = fraction(equivalent_width_obs_a, line_width_km_s) ** 2 + feed.floor**2
    if measurement.narrow_width_a is not None:
        narrow_obs_a = measurement.narrow_width_a * (1.0 + redshift)
        variance = variance + fraction(narrow_obs_a, NARROW_KM_S) ** 2
    return np.asarray(np.sqrt(variance))


def spectral_continuum_error(
    feed: Feed,
    telescope: Telescope,
    magnitude: Floats,
    exposure_s: Floats,
    conditions: Conditions,
    wavelength_obs_a: float,
    window_a: float,
) -> NDArray[np.float64]:
    """Return the fractional error of the mean continuum in a window of a spectrum.

    Photons alone, without the floor: the error of a spectrum's scale is common to its line and its
    continuum, so the caller adds one and the same to both. `window_a` is the observed width of the
    window, angstrom; the rest as in `line_error`, with the continuum's wavelength for the line's.
    """
    rates = _rates(feed, telescope, magnitude, conditions, wavelength_obs_a)
    return np.asarray(_fraction(rates, exposure_s, feed.exposures) / np.sqrt(window_a))


def signal_to_noise(
    feed: Feed,
    telescope: Telescope,
    magnitude: Floats,
    exposure_s: Floats,
    conditions: Conditions,
    wavelength_a: float | None,
) -> NDArray[np.float64]:
    """Return the target's signal over its photon, sky and detector noise.

    Imaging (`wavelength_a` None): of the flux in the band. Spectra: of the continuum at
    `wavelength_a` (observed), per pixel for a `Spectrograph` and per angstrom for a `KnownCase`.
    The rest as in `image_error` and `line_error`.
    """
    rates = _rates(feed, telescope, magnitude, conditions, wavelength_a)
    instrument = feed.instrument
    width_a = instrument.dispersion_a if isinstance(instrument, Spectrograph) else 1.0
    return np.asarray(np.sqrt(width_a) / _fraction(rates, exposure_s, feed.exposures))


def _rates(
    feed: Feed,
    telescope: Telescope,
    magnitude: Floats,
    conditions: Conditions,
    wavelength_a: float | None,
) -> Rates:
    """Return the rates of any instrument; a spectrum has a wavelength, an image has none."""
    instrument = feed.instrument
    if isinstance(instrument, Camera):
        return camera_rates(instrument, telescope, magnitude, conditions)
    if isinstance(instrument, Spectrograph):
        if wavelength_a is None:
            raise ValueError("a spectrograph takes no images")
        return spectrograph_rates(instrument, telescope, magnitude, conditions, wavelength_a)
    return known_rates(instrument, magnitude, conditions, wavelength_a)


def _fraction(rates: Rates, exposure_s: Floats, exposures: int) -> Floats:
    """Return noise over signal of a band's flux, or of one angstrom."""
    noise: Floats = np.sqrt(variance_e2(rates, exposure_s, exposures))
    return noise / (rates.source_e_s * exposure_s)
