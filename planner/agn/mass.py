"""Black-hole mass from lag and line width, and how well it will be known."""

from __future__ import annotations

import math

__all__ = ["log_mass", "log_virial_product", "mass_error_dex"]

LOG_UNIT = math.log10(0.195174e6)
"""c x 1 d x (1000 km/s)^2 / G in suns."""
LOG_F = 0.05
"""log10 of the virial factor for the full width at half maximum, +- 0.12 (Woo et al. 2015,
ApJ 801, 38): f = 1.12. It was found for H beta and serves for the other lines too."""
F_SCATTER_DEX = 0.39
"""From AGN to AGN (Yu et al. 2019, MNRAS 488, 1519). Shen et al. (2024, ApJS 272, 26) find 0.31 for
the line's dispersion in the rms spectrum, a better measure than the width used here."""
WIDTH_ERROR = 0.05
"""Fractional error of a measured line width: common practice, no source."""


def log_virial_product(lag_rest_d: float, line_width_km_s: float) -> float:
    """Return log10 of c lag width^2 / G in suns; the lag is in the rest frame."""
    return LOG_UNIT + math.log10(lag_rest_d) + 2 * math.log10(line_width_km_s / 1000)


def log_mass(lag_rest_d: float, line_width_km_s: float) -> float:
    """Return log10 of the virial mass in suns.

    Parameters
    ----------
    lag_rest_d : float
        Days, rest frame.
    line_width_km_s : float
        Full width at half maximum, rest frame.
    """
    return LOG_F + log_virial_product(lag_rest_d, line_width_km_s)


def mass_error_dex(lag_error: float) -> float:
    """Return the standard error of log10(mass) once the lag is known.

    Parameters
    ----------
    lag_error : float
        Fractional standard error of the lag.

    Returns
    -------
    float
        The errors of lag and width and the scatter of the virial factor, in quadrature; the last
        outweighs the others for any lag worth publishing.
    """
    return math.hypot(lag_error / math.log(10), 2 * WIDTH_ERROR / math.log(10), F_SCATTER_DEX)
