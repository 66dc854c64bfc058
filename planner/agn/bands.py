"""Photometric bands, and the Galaxy's reddening in them."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from planner.base.bands import BANDS, Band

__all__ = ["BANDS", "Band", "extinction_mag"]

R_V = 3.1


def extinction_mag(wavelength_a: float, ebv_mag: float) -> float:
    """Return the Galaxy's extinction at one wavelength.

    Fitzpatrick's (1999, PASP 111, 63) law with R_V = 3.1, as in the `dust_extinction` package.
    E(B-V) is used as given: values of the Schlegel, Finkbeiner & Davis (1998) map are to be
    multiplied by 0.86 before (Schlafly & Finkbeiner 2011, ApJ 737, 103).

    Parameters
    ----------
    wavelength_a : float
        Observed, 1000 to 33000 angstrom.
    ebv_mag : float
        E(B-V).
    """
    return ebv_mag * _extinction_per_ebv(wavelength_a) if ebv_mag else 0.0


@lru_cache(maxsize=256)
def _extinction_per_ebv(wavelength_a: float) -> float:
    """Return A(lambda) / E(B-V)."""
    from dust_extinction.parameter_averages import F99

    inverse_micron = np.array([1e4 / wavelength_a])
    return R_V * float(F99(Rv=R_V).evaluate(inverse_micron, R_V)[0])
