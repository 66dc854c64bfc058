"""From the unit driver to measured fluxes.

The walk is taken to be linear in flux, not in magnitude, so that the light curves stay Gaussian
and the likelihood of a walk is their true likelihood; for the amplitudes in question (rms of 0.1
to 0.3 mag) the two differ by a few per cent of the variation. A strongly variable, nearly
host-free target may therefore reach zero flux in rare draws; nothing is clipped.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

__all__ = ["FRACTION_PER_MAG", "observed_continuum", "observed_line"]

Floats = NDArray[np.float64]

FRACTION_PER_MAG = 0.4 * math.log(10.0)
"""Fractional flux change per small change in magnitude, from m = -2.5 log10(flux): 0.921."""


def observed_continuum(
    x: Floats,
    amplitude_mag: float,
    agn_fraction: float,
    error: Floats | float,
    normals: Floats,
) -> Floats:
    """Return the continuum's flux over its mean (AGN and host together), with noise.

    Parameters
    ----------
    x : array (n,)
        Unit driver at the epochs.
    amplitude_mag : float
        Asymptotic rms of the AGN's own light.
    agn_fraction : float
        Share of the AGN in the mean flux of the band; the rest is constant.
    error : array (n,) or float
        One-sigma error of each epoch over the mean flux.
    normals : array (n,)
        Standard normal deviates.
    """
    signal = agn_fraction * FRACTION_PER_MAG * amplitude_mag * x
    return np.asarray(1.0 + signal + error * normals)


def observed_line(
    y: Floats,
    amplitude_mag: float,
    responsivity: float,
    error: Floats | float,
    normals: Floats,
) -> Floats:
    """Return the line's flux over its mean, with noise.

    Parameters
    ----------
    y : array (m,)
        Unit driver delayed and smoothed by the response, at the epochs.
    amplitude_mag : float
        Asymptotic rms of the driving continuum, without host.
    responsivity : float
        Fractional change of the line per fractional change of the delayed continuum.
    error : array (m,) or float
        One-sigma error of each epoch over the mean flux.
    normals : array (m,)
        Standard normal deviates.
    """
    signal = responsivity * FRACTION_PER_MAG * amplitude_mag * y
    return np.asarray(1.0 + signal + error * normals)
