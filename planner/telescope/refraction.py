"""How far the air moves images of different wavelengths apart."""

from __future__ import annotations

import numpy as np

from planner.telescope.conditions import Floats

__all__ = ["differential_refraction_arcsec", "refractivity"]

PRESSURE_MMHG, TEMPERATURE_C, VAPOUR_MMHG = 600.0, 7.0, 8.0
"""Of Filippenko's table: a site 2 km high. At sea level refraction is a quarter stronger."""


def refractivity(wavelength_a: Floats) -> Floats:
    """Return n - 1 of the air: Filippenko (1982, PASP 94, 715, eqs. 1-3)."""
    per_micron2 = (1e4 / wavelength_a) ** 2
    standard = 64.328 + 29498.1 / (146.0 - per_micron2) + 255.4 / (41.0 - per_micron2)
    warmth = 1.0 + 0.003661 * TEMPERATURE_C
    pressure = 1.0 + (1.049 - 0.0157 * TEMPERATURE_C) * 1e-6 * PRESSURE_MMHG
    dry = standard * PRESSURE_MMHG * pressure / (720.883 * warmth)
    vapour = VAPOUR_MMHG * (0.0624 - 0.000680 * per_micron2) / warmth
    return 1e-6 * (dry - vapour)


def differential_refraction_arcsec(
    wavelength_a: Floats, guide_a: Floats, airmass: Floats
) -> Floats:
    """Return how much higher than `guide_a` a wavelength is seen: Filippenko's eq. 4.

    The tangent of the zenith distance is taken from airmass = sec z.
    """
    tangent: Floats = np.sqrt(np.maximum(np.square(airmass) - 1.0, 0.0))
    bend_arcsec = 206265.0 * (refractivity(wavelength_a) - refractivity(guide_a))
    return bend_arcsec * tangent
