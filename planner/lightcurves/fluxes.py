"""From the unit driver to fluxes.

The walk is taken to be linear in flux, not in magnitude, so that the light curves stay Gaussian
and the likelihood of a walk is their true likelihood; for the amplitudes in question (rms of 0.1
to 0.3 mag) the two differ by a few per cent of the variation. A strongly variable, nearly
host-free target may therefore reach zero flux in rare draws; nothing is clipped.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

__all__ = ["FRACTION_PER_MAG", "continuum_flux", "line_flux"]

Floats = NDArray[np.float64]

FRACTION_PER_MAG = 0.4 * math.log(10.0)
"""Fractional flux change per small change in magnitude, from m = -2.5 log10(flux): 0.921."""


def continuum_flux(x: Floats, amplitude_mag: float, agn_fraction: float) -> Floats:
    """Return the continuum's true flux over its mean, AGN and host together.

    Parameters
    ----------
    x : array (n,)
        Unit driver at the epochs.
    amplitude_mag : float
        Asymptotic rms of the AGN's own light.
    agn_fraction : float
        Share of the AGN in the mean flux of the band; the rest is constant.
    """
    return np.asarray(1.0 + agn_fraction * FRACTION_PER_MAG * amplitude_mag * x)


def line_flux(y: Floats, amplitude_mag: float, responsivity: float) -> Floats:
    """Return the line's true flux over its mean.

    Parameters
    ----------
    y : array (m,)
        Unit driver delayed and smoothed by the response, at the epochs.
    amplitude_mag : float
        Asymptotic rms of the driving continuum, without host.
    responsivity : float
        Fractional change of the line per fractional change of the delayed continuum.
    """
    return np.asarray(1.0 + responsivity * FRACTION_PER_MAG * amplitude_mag * y)
