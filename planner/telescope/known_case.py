"""Electrons from one known signal-to-noise, such as an instrument's own calculator gives."""

from __future__ import annotations

import numpy as np

from planner.base.bands import BANDS
from planner.model.observatory import KnownCase
from planner.telescope.conditions import Conditions, Floats, fwhm_arcsec
from planner.telescope.rates import Rates

__all__ = ["known_rates"]

RADIUS_FWHM = 1.0
"""Of the aperture, where the sky's share of the noise has to be estimated; holds 94 %."""
SLIT_FWHM, LENGTH_FWHM = 1.0, 2.0
"""Of the slit and the extraction, likewise; they hold 75 %."""
ENCLOSED, IN_SLIT = 0.94, 0.75


def known_rates(
    case: KnownCase, magnitude: Floats, conditions: Conditions, wavelength_a: Floats | None
) -> Rates:
    """Return the rates of an instrument known from one case.

    Parameters
    ----------
    case : KnownCase
        One frame of `exposure_s` under a dark sky.
    magnitude
        In the case's band and system, AGN and host together.
    conditions : Conditions
        At the band's pivot (imaging) or at `wavelength_a`.
    wavelength_a
        Observed, of a spectrum; None: imaging.

    Notes
    -----
    With shares f of the sky and g of the read-out in the variance V of the case, the target has
    the rest, S = (1 - f - g) V, and S / sqrt(V) is the known signal-to-noise, which gives all
    three. The target then scales with brightness and extinction; the sky with its brightness and
    the area summed, FWHM^2 for an aperture and FWHM for the length along a slit; read-out does
    not change. Unlike the full models it knows no slit losses, no seeing but the airmass's, and
    takes dark current for sky.
    """
    sky_share = _sky_share(case, conditions, wavelength_a)
    own_share = 1.0 - sky_share - case.read_share
    variance_e2 = (case.signal_to_noise / own_share) ** 2
    dimming_mag = (
        magnitude
        - case.magnitude_mag
        + conditions.extinction_mag * (conditions.airmass - case.airmass)
    )
    brighter_mag = conditions.known_sky_ab_mag - conditions.sky_ab_mag
    blur = np.power(np.divide(conditions.airmass, case.airmass), 0.6)
    area = blur**2 if wavelength_a is None else blur
    per_s = variance_e2 / case.exposure_s
    return Rates(
        own_share * per_s * np.power(10.0, np.multiply(-0.4, dimming_mag)),
        sky_share * per_s * area * np.power(10.0, np.multiply(0.4, brighter_mag)),
        case.read_share * variance_e2,
    )


def _sky_share(case: KnownCase, conditions: Conditions, wavelength_a: Floats | None) -> Floats:
    """Return the sky's share of the noise; where it is not known, that of a usual aperture.

    Only ratios enter, so the size of the telescope does not matter.
    """
    if case.sky_share is not None:
        return case.sky_share
    band = BANDS[case.band]
    there = conditions._replace(airmass=case.airmass)
    if wavelength_a is None:
        fwhm = fwhm_arcsec(there, band.pivot_a)
        area_arcsec2, held = np.pi * (RADIUS_FWHM * fwhm) ** 2, ENCLOSED
    else:
        fwhm = fwhm_arcsec(there, wavelength_a)
        area_arcsec2, held = SLIT_FWHM * LENGTH_FWHM * fwhm**2, IN_SLIT
    target_ab_mag = (
        case.magnitude_mag + band.ab_minus_vega_mag + conditions.extinction_mag * case.airmass
    )
    fainter_mag = np.subtract(conditions.known_sky_ab_mag, target_ab_mag)
    sky_over_target = area_arcsec2 / held * np.power(10.0, -0.4 * fainter_mag)
    share: Floats = (1.0 - case.read_share) * sky_over_target / (1.0 + sky_over_target)
    return share
