"""The broad emission lines whose lags are measured."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["DEFAULT_WIDTH_KM_S", "LINES", "Line", "default_line"]

DEFAULT_WIDTH_KM_S = 4000.0
"""Full width at half maximum of a broad line that nobody gave: common practice, no source."""


@dataclass(frozen=True, slots=True)
class Line:
    """One broad emission line."""

    wavelength_rest_a: float
    """In vacuum."""
    equivalent_width_rest_a: float
    """Over the AGN's own continuum, where the target does not say."""


LINES = {
    "Hbeta": Line(4862.7, 80.0),
    "Halpha": Line(6564.6, 300.0),
    "MgII": Line(2798.8, 35.0),
    "CIV": Line(1549.1, 40.0),
}
"""Wavelengths from memory. Equivalent widths: common practice, no source; rounded upwards from a
quasar composite spectrum (46, 195, 32 and 24 angstrom: Vanden Berk et al. 2001, AJ 122, 549, from
memory), since reverberation targets are mostly less luminous, and their lines stronger."""

HBETA_UP_TO = 0.9
"""Beyond, H beta is redder than 9200 angstrom, where sky lines crowd."""
MGII_UP_TO = 2.0
"""Beyond, Mg II is redder than 8400 angstrom, and C IV is bluewards at 4650."""


def default_line(redshift: float) -> str:
    """Return the line to measure where the target does not say: H beta, then Mg II, then C IV."""
    if redshift <= HBETA_UP_TO:
        return "Hbeta"
    return "MgII" if redshift <= MGII_UP_TO else "CIV"
