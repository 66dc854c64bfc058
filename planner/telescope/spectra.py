"""A slit or fibre spectrograph, per observed angstrom."""

from __future__ import annotations

import numpy as np
from scipy.special import chndtr, erf

from planner.model.observatory import Spectrograph, Telescope
from planner.telescope.conditions import Conditions, Floats, fwhm_arcsec
from planner.telescope.rates import Rates, ab_photons_s_a
from planner.telescope.refraction import differential_refraction_arcsec

__all__ = ["EXTRACTION_FWHM", "extracted", "spectrograph_rates"]

EXTRACTION_FWHM = 2.0
"""Length along the slit that is summed, in FWHM of the image (common practice, no source)."""

_FWHM_PER_SIGMA = 2.0 * np.sqrt(2.0 * np.log(2.0))


def spectrograph_rates(
    spectrograph: Spectrograph,
    telescope: Telescope,
    ab_mag: Floats,
    conditions: Conditions,
    wavelength_a: Floats,
) -> Rates:
    """Return electrons per observed angstrom of the extracted spectrum.

    Parameters
    ----------
    spectrograph, telescope
        The instrument.
    ab_mag
        Of the continuum at `wavelength_a`, AGN and host together, taken as a point source.
    conditions : Conditions
        At `wavelength_a`.
    wavelength_a
        Observed, angstrom.

    Notes
    -----
    Sky, dark current and read noise are those of the pixels summed: 2 FWHM along a slit, the
    whole image of a fibre.
    """
    width_arcsec = spectrograph.slit_arcsec
    fwhm = fwhm_arcsec(conditions, wavelength_a)
    if spectrograph.fibre:
        length_arcsec: Floats = width_arcsec
        area_arcsec2: Floats = np.pi / 4.0 * width_arcsec**2
    else:
        length_arcsec = EXTRACTION_FWHM * fwhm
        area_arcsec2 = width_arcsec * length_arcsec
    pixels = length_arcsec / spectrograph.pixel_arcsec / spectrograph.dispersion_a
    above_mag = ab_mag + conditions.extinction_mag * conditions.airmass
    source = ab_photons_s_a(telescope, above_mag, wavelength_a)
    sky = ab_photons_s_a(telescope, conditions.sky_ab_mag, wavelength_a)
    return Rates(
        source * spectrograph.throughput * extracted(spectrograph, conditions, wavelength_a),
        sky * spectrograph.throughput * area_arcsec2 + spectrograph.dark_e_s * pixels,
        spectrograph.read_noise_e**2 * pixels,
    )


def extracted(spectrograph: Spectrograph, conditions: Conditions, wavelength_a: Floats) -> Floats:
    """Return the share of a point source's light that enters the slit and is summed.

    The image is a round Gaussian, moved from the slit's middle by the differential refraction
    between `wavelength_a` and the wavelength that is guided on: in full for a fibre (the
    non-central chi-square distribution of the distance from its middle), by its part across a
    slit of fixed position angle, by nothing across one along the parallactic angle.
    """
    sigma = fwhm_arcsec(conditions, wavelength_a) / _FWHM_PER_SIGMA
    half = spectrograph.slit_arcsec / 2.0 / sigma
    offset = (
        differential_refraction_arcsec(wavelength_a, spectrograph.guide_a, conditions.airmass)
        / sigma
    )
    if spectrograph.fibre:
        in_circle: Floats = chndtr(half**2, 2.0, offset**2)
        return in_circle
    along = float(erf(EXTRACTION_FWHM / 2.0 * _FWHM_PER_SIGMA / np.sqrt(2.0)))
    if spectrograph.slit_angle_deg is None:
        return along * _between(0.0, half)
    across = offset * np.sin(
        np.radians(np.subtract(spectrograph.slit_angle_deg, conditions.parallactic_deg))
    )
    return along * _between(across, half)


def _between(offset: Floats, half: Floats) -> Floats:
    """Return the share of a Gaussian of unit width, off by `offset`, within `half` of zero."""
    share: Floats = (
        erf((half - offset) / np.sqrt(2.0)) + erf((half + offset) / np.sqrt(2.0))
    ) / 2.0
    return share
