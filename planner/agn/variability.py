"""How much and how fast an AGN varies: the scalings of its damped random walk."""

from __future__ import annotations

import math

from planner.agn.bands import BANDS
from planner.agn.luminosity import ALPHA_NU, absolute_ab_mag

__all__ = ["AMPLITUDE_SCATTER_DEX", "TIMESCALE_SCATTER_DEX", "absolute_i_mag", "damped_random_walk"]

AMPLITUDE_SCATTER_DEX = 0.2
TIMESCALE_SCATTER_DEX = 0.35
"""Spread of single AGN about the scalings of `damped_random_walk`, from memory."""


def absolute_i_mag(log_lum: float, wavelength_a: float) -> float:
    """Return the AGN's absolute i magnitude (AB), K-corrected to redshift 2.

    Parameters
    ----------
    log_lum : float
        log10 of lambda L_lambda in erg/s at rest `wavelength_a` (angstrom).

    Notes
    -----
    M(z=2) = M(z=0) - 2.5 (1 + alpha) log10(3), the convention of Richards et al. (2006, AJ 131,
    2766), which the scalings of MacLeod et al. follow (from memory).
    """
    at_redshift_0 = absolute_ab_mag(log_lum, wavelength_a, BANDS["i"].pivot_a)
    return at_redshift_0 - 2.5 * (1 + ALPHA_NU) * math.log10(3)


def damped_random_walk(
    wavelength_rest_a: float, absolute_i_z2_mag: float, log_mass: float
) -> tuple[float, float]:
    """Return the asymptotic rms and the damping timescale expected of an AGN.

    MacLeod et al. (2010, ApJ 721, 1014, table 1). They give SF_inf, the rms difference of two
    distant epochs, which is sqrt(2) times the rms returned here.

    Parameters
    ----------
    wavelength_rest_a : float
        Rest wavelength at which the AGN is watched, angstrom.
    absolute_i_z2_mag : float
        As of `absolute_i_mag`.
    log_mass : float
        log10 of the black hole's mass in suns.

    Returns
    -------
    amplitude_mag : float
        Asymptotic rms of the AGN's own light.
    timescale_rest_d : float
        Days, rest frame.
    """
    colour = math.log10(wavelength_rest_a / 4000)
    brightness = absolute_i_z2_mag + 23
    mass = log_mass - 9
    log_sf = -0.51 - 0.479 * colour + 0.131 * brightness + 0.18 * mass
    log_tau = 2.4 + 0.17 * colour + 0.03 * brightness + 0.21 * mass
    return 10**log_sf / math.sqrt(2), 10**log_tau
