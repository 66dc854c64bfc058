"""The one noise model of the package: what each instrument is reduced to.

Whatever the instrument, an epoch collects electrons S t from the target and a variance
S t + B t + n R, where t is the shutter time, B the rate of everything else that grows with time
(sky, dark current) and R the read-out variance of each of n frames (Merline & Howell 1995,
Experimental Astronomy 6, 163, without their terms for digitisation and for the error of the sky
level, which is taken as known from many pixels). `imaging`, `spectra` and `known_case` give S, B
and R; `errors` makes flux errors of them.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from planner.base.bands import AB_ZERO_PHOTONS_S_CM2
from planner.model.observatory import Telescope
from planner.telescope.conditions import Floats

__all__ = ["Rates", "ab_photons_s_a", "variance_e2"]


class Rates(NamedTuple):
    """Electrons of a band's flux (imaging) or of an observed angstrom of spectrum."""

    source_e_s: Floats
    """Of the target: AGN and host."""
    other_e_s: Floats
    """Variance per second of all else that grows with time."""
    read_e2: Floats
    """Variance of one frame's read-out."""


def variance_e2(rates: Rates, exposure_s: Floats, exposures: int) -> Floats:
    """Return the noise variance of an epoch of `exposures` frames that share `exposure_s`."""
    return (rates.source_e_s + rates.other_e_s) * exposure_s + exposures * rates.read_e2


def ab_photons_s_a(telescope: Telescope, ab_mag: Floats, wavelength_a: Floats) -> Floats:
    """Return the photons per second and angstrom that fall on the mirror."""
    area_cm2 = np.pi / 4.0 * (100.0 * telescope.aperture_m) ** 2 * (1.0 - telescope.obstruction**2)
    photons: Floats = (
        AB_ZERO_PHOTONS_S_CM2 / wavelength_a * area_cm2 * np.power(10.0, np.multiply(-0.4, ab_mag))
    )
    return photons
