"""Targets, and what is expected of them."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Forecast", "Magnitude", "Target"]


@dataclass(frozen=True, slots=True)
class Magnitude:
    """One apparent magnitude of AGN and host together, not corrected for extinction."""

    band: str
    """``u g r i z`` (AB) or ``B V R`` (Vega)."""
    value_mag: float


@dataclass(frozen=True, slots=True)
class Target:
    """One AGN, as the observer describes it. None: not given."""

    name: str
    ra_deg: float
    """ICRS."""
    dec_deg: float
    """ICRS."""
    redshift: float
    magnitude: Magnitude | None = None
    log_luminosity: tuple[int, float] | None = None
    """(rest wavelength in angstrom: 5100, 3000 or 1350; log10 of lambda L_lambda in erg/s,
    host removed)."""
    line: str | None = None
    """``Hbeta``, ``Halpha``, ``MgII`` or ``CIV``."""
    host_fraction: float | None = None
    """Share of the host galaxy in the flux of the magnitude's band, in [0, 1)."""
    ebv_mag: float = 0.0
    """Galactic reddening E(B-V)."""
    line_width_km_s: float | None = None
    """Full width at half maximum, rest frame."""
    line_equivalent_width_a: float | None = None
    """Rest frame, angstrom."""
    log_mass: float | None = None
    """log10 of the black hole's mass in suns, where known."""
    amplitude_mag: float | None = None
    """Asymptotic rms of the AGN's own light (SF_inf / sqrt 2), where known."""
    timescale_rest_d: float | None = None
    """Damping timescale, rest frame, where known."""
    lag_rest_d: float | None = None
    """Lag already known, rest frame."""
    priority: float = 1.0
    iron_strength: float | None = None
    """R_Fe, the flux ratio of Fe II 4434-4684 to broad H beta."""
    notes: str = ""


@dataclass(frozen=True, slots=True)
class Forecast:
    """What one target is expected to do: everything a trial draws from."""

    name: str
    line: str
    relation: str
    """Key of the radius-luminosity relation used, or ``"given"``."""
    log_luminosity: float
    """log10 of lambda L_lambda in erg/s at the relation's wavelength, host removed."""
    luminosity_wavelength_a: int
    lag_rest_d: float
    """Median of the log-normal prior."""
    lag_obs_d: float
    lag_scatter_dex: float
    """Standard deviation of log10(lag)."""
    amplitude_mag: float
    """Median asymptotic rms of the AGN's own light."""
    amplitude_scatter_dex: float
    timescale_obs_d: float
    """Median damping timescale, observed frame."""
    timescale_scatter_dex: float
    agn_fraction: float
    """Share of the AGN in the flux of the continuum stream's band."""
    log_mass: float
    mass_dex: float
    """Error of log10(mass) to expect once the lag is measured as the success rule asks."""
    line_width_km_s: float
    line_equivalent_width_a: float
    """Rest frame."""
    outside_range: bool
    """The luminosity lies outside the range in which the relation was calibrated."""
