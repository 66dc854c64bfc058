"""Photometric bands, and the Galaxy's reddening in them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

__all__ = ["BANDS", "Band", "extinction_mag"]

R_V = 3.1


@dataclass(frozen=True, slots=True)
class Band:
    """One photometric band."""

    pivot_a: float
    """Pivot wavelength, angstrom."""
    ab_minus_vega_mag: float
    """What to add to a magnitude of this band to have it on the AB scale."""


BANDS = {
    "u": Band(3557.0, 0.0),
    "g": Band(4703.0, 0.0),
    "r": Band(6176.0, 0.0),
    "i": Band(7490.0, 0.0),
    "z": Band(8947.0, 0.0),
    "B": Band(4371.0, -0.09),
    "V": Band(5478.0, 0.02),
    "R": Band(6498.0, 0.21),
}
"""SDSS u g r i z, whose magnitudes are taken as AB, and Bessell B V R, on the Vega scale.

Pivot wavelengths of the standard transmission curves to the nearest angstrom, and Vega-to-AB
offsets of Blanton & Roweis (2007, AJ 133, 734, table 1); both from memory.
"""


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
