"""How well one visit measures a target: the sky's conditions joined to the telescope's errors."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from astropy.coordinates import angular_separation
from numpy.typing import NDArray

from planner.agn import LINES, ab_magnitude_at, magnitude_in
from planner.base.bands import BANDS
from planner.model.campaign import Campaign
from planner.model.observatory import Feed, KnownCase, Site, Spectrograph
from planner.model.target import Forecast, Target
from planner.sky import airmass_of, extinction_at, positions_at, sky_ab_mag, sun_moon_at
from planner.telescope import (
    Conditions,
    image_error,
    line_error,
    signal_to_noise,
    spectral_continuum_error,
)

__all__ = ["CONTINUUM_WINDOW_A", "Depth", "depth_of"]

Floats = NDArray[np.float64]

CONTINUUM_WINDOW_A = 50.0
"""Rest width of the window in which spectra give the continuum (our choice)."""


@dataclass(frozen=True, slots=True)
class Depth:
    """What one telescope's visits to one target measure, at any time and exposure."""

    site: Site
    target: Target
    wavelength_a: float
    """Observed; where sky and extinction are taken."""
    magnitude: float
    error: Callable[[float, Conditions], Floats]
    """Fractional flux error of an exposure in seconds, calibration included."""
    signal_to_noise: Callable[[float, Conditions], Floats]
    known_sky_ab_mag: float

    def conditions_at(self, mjd: Floats) -> Conditions:
        """Return airmass, sky, seeing and field rotation at UTC `mjd`, any shape."""
        target, quality = self.target, self.site.sky
        pointing = positions_at(target.ra_deg, target.dec_deg, self.site, mjd)
        moon = sun_moon_at(self.site, mjd)
        apart = angular_separation(
            np.radians(moon.moon_ra_deg),
            np.radians(moon.moon_dec_deg),
            np.radians(target.ra_deg),
            np.radians(target.dec_deg),
        )
        return Conditions(
            airmass=airmass_of(pointing.altitude_deg),
            sky_ab_mag=sky_ab_mag(
                quality,
                self.wavelength_a,
                pointing.altitude_deg,
                moon.moon_altitude_deg,
                moon.moon_illumination,
                np.degrees(apart),
            ),
            extinction_mag=extinction_at(quality, self.wavelength_a),
            seeing_arcsec=quality.seeing_arcsec,
            parallactic_deg=pointing.parallactic_angle_deg,
            known_sky_ab_mag=self.known_sky_ab_mag,
        )


def depth_of(
    campaign: Campaign, kind: str, feed: Feed, target: Target, forecast: Forecast
) -> Depth:
    """Return what a telescope measures of a target.

    Parameters
    ----------
    kind : str
        ``"line"``; ``"continuum"`` for images; ``"spectra"`` for the continuum of the line's own
        spectra, whose error here is without that of the spectrum's scale.
    """
    telescope, site = campaign.telescope(feed.telescope), campaign.site(feed.telescope)
    instrument = feed.instrument
    stretch = 1 + target.redshift
    line_a = LINES[forecast.line].wavelength_rest_a * stretch
    imaging = kind == "continuum"
    if isinstance(instrument, Spectrograph):
        wavelength, magnitude = line_a, ab_magnitude_at(target, line_a, campaign.cosmology)
    else:
        wavelength = BANDS[instrument.band].pivot_a if imaging else line_a
        magnitude = magnitude_in(target, instrument.band, campaign.cosmology)
    known_sky = np.nan
    if isinstance(instrument, KnownCase):
        altitude = np.degrees(np.arcsin(1 / instrument.airmass))
        known_sky = float(sky_ab_mag(site.sky, wavelength, altitude, -90.0, 0.0, 90.0))

    def error(exposure_s: float, conditions: Conditions) -> Floats:
        if imaging:
            return image_error(feed, telescope, magnitude, exposure_s, conditions)
        if kind == "spectra":
            window_a = CONTINUUM_WINDOW_A * stretch
            return spectral_continuum_error(
                feed, telescope, magnitude, exposure_s, conditions, wavelength, window_a
            )
        assert campaign.line.measurement is not None
        return line_error(
            feed,
            telescope,
            campaign.line.measurement,
            magnitude,
            exposure_s,
            conditions,
            equivalent_width_obs_a=forecast.line_equivalent_width_a * stretch,
            line_width_km_s=forecast.line_width_km_s,
            wavelength_obs_a=line_a,
            redshift=target.redshift,
        )

    def ratio(exposure_s: float, conditions: Conditions) -> Floats:
        spectrum_a = None if imaging else wavelength
        return signal_to_noise(feed, telescope, magnitude, exposure_s, conditions, spectrum_a)

    return Depth(site, target, wavelength, magnitude, error, ratio, known_sky)
