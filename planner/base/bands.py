"""Photometric bands, and the photons that a magnitude stands for."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["AB_ZERO_PHOTONS_S_CM2", "BANDS", "Band"]

AB_ZERO_PHOTONS_S_CM2 = 3631e-23 / 6.62607015e-27
"""Photons per second and cm2 of a source of AB magnitude 0 (3631 Jy; Oke & Gunn 1983, ApJ 266, 713)
in a unit of ln(wavelength): 5.480e6. Over the wavelength in angstrom it is the rate per angstrom.
"""


@dataclass(frozen=True, slots=True)
class Band:
    """One photometric band."""

    pivot_a: float
    """Pivot wavelength, angstrom."""
    ab_minus_vega_mag: float
    """What to add to a magnitude of this band to have it on the AB scale."""
    width_a: float
    """Equivalent width: the transmission's integral over its peak, angstrom."""


BANDS = {
    "u": Band(3557.0, 0.0, 541.0),
    "g": Band(4703.0, 0.0, 1065.0),
    "r": Band(6176.0, 0.0, 1056.0),
    "i": Band(7490.0, 0.0, 1103.0),
    "z": Band(8947.0, 0.0, 940.0),
    "B": Band(4371.0, -0.09, 959.0),
    "V": Band(5478.0, 0.02, 893.0),
    "R": Band(6498.0, 0.21, 1591.0),
}
"""SDSS u g r i z, whose magnitudes are taken as AB, and Bessell B V R, on the Vega scale.

Pivot wavelengths of the standard transmission curves to the nearest angstrom, and Vega-to-AB
offsets of Blanton & Roweis (2007, AJ 133, 734, table 1). Widths: curves of SDSS with its detectors
and the air above them, and sums over table 2 of Bessell (1990, PASP 102, 1181). All from memory.
"""
