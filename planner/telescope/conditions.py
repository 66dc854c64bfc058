"""The air and the sky of one epoch."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

__all__ = ["Conditions", "Floats", "fwhm_arcsec"]

Floats = NDArray[np.float64] | float
"""A number, or an array that broadcasts with the other ones."""


class Conditions(NamedTuple):
    """Air and sky at the wavelength in question; numbers, or arrays that broadcast."""

    airmass: Floats
    sky_ab_mag: Floats
    """AB magnitude of a square arcsec of sky, moonlight included, as seen through the air."""
    extinction_mag: Floats
    """Per unit airmass."""
    seeing_arcsec: Floats
    """Full width at half maximum at the zenith at 5000 angstrom."""
    parallactic_deg: Floats
    """Position angle of the zenith; only a slit of fixed position angle asks for it."""
    known_sky_ab_mag: Floats
    """The dark sky at the airmass of a `KnownCase`; nothing else asks for it."""


def fwhm_arcsec(conditions: Conditions, wavelength_a: Floats) -> Floats:
    """Return the image's full width at half maximum at the airmass and the wavelength.

    Seeing grows as airmass^0.6 and falls as wavelength^0.2: Kolmogorov's turbulence (Fried 1966,
    JOSA 56, 1372; from memory).
    """
    blur: Floats = (
        conditions.seeing_arcsec
        * np.power(conditions.airmass, 0.6)
        * np.power(np.divide(wavelength_a, 5000.0), -0.2)
    )
    return blur
