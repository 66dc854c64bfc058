"""A camera: aperture photometry of a point source."""

from __future__ import annotations

import numpy as np

from planner.base.bands import BANDS
from planner.model.observatory import Camera, Telescope
from planner.telescope.conditions import Conditions, Floats, fwhm_arcsec
from planner.telescope.rates import Rates, ab_photons_s_a

__all__ = ["camera_rates"]


def camera_rates(
    camera: Camera, telescope: Telescope, magnitude: Floats, conditions: Conditions
) -> Rates:
    """Return electrons in an aperture of `aperture_fwhm` FWHM radius.

    Parameters
    ----------
    camera, telescope
        The throughput is taken as constant over the band's equivalent width.
    magnitude
        In the camera's band and its own system: all light in the aperture, AGN and host. How the
        host's share changes with the seeing is left to the floor.
    conditions : Conditions
        At the band's pivot wavelength.

    Notes
    -----
    The aperture holds 1 - 2^(-(2 r / FWHM)^2) of a Gaussian image.
    """
    band = BANDS[camera.band]
    radius_arcsec = camera.aperture_fwhm * fwhm_arcsec(conditions, band.pivot_a)
    area_arcsec2 = np.pi * radius_arcsec**2
    pixels = area_arcsec2 / camera.pixel_arcsec**2
    enclosed = 1.0 - 2.0 ** (-((2.0 * camera.aperture_fwhm) ** 2))
    ab_mag = magnitude + band.ab_minus_vega_mag + conditions.extinction_mag * conditions.airmass
    electrons = camera.throughput * band.width_a
    sky = ab_photons_s_a(telescope, conditions.sky_ab_mag, band.pivot_a) * electrons
    return Rates(
        ab_photons_s_a(telescope, ab_mag, band.pivot_a) * electrons * enclosed,
        sky * area_arcsec2 + camera.dark_e_s * pixels,
        camera.read_noise_e**2 * pixels,
    )
