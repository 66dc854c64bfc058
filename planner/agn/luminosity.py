"""From apparent magnitudes to luminosities and back.

The AGN's continuum is a power law, f_nu ~ nu^-0.44 (Vanden Berk et al. 2001, AJ 122, 549). The
host's share is taken as the same in every band: its true colour is not known from one number, and
bluer bands have less of it.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import lru_cache
from typing import Any

from planner.agn.bands import BANDS, Band, extinction_mag
from planner.base.errors import InputError
from planner.model.campaign import Cosmology
from planner.model.target import Target

__all__ = [
    "ab_magnitude_at",
    "absolute_ab_mag",
    "agn_log_luminosity",
    "apparent_ab_mag",
    "at_wavelength",
    "host_fraction",
    "log_luminosity",
    "luminosity_error_dex",
    "magnitude_in",
]

ALPHA_NU = -0.44
AB_ZERO_MAG = 48.60
"""m_AB = -2.5 log10(f_nu in erg/s/cm2/Hz) - 48.60 (Oke & Gunn 1983)."""
LIGHT_A_S = 2.99792458e18
MPC_CM = 3.0856775814913673e24
TEN_PC_MPC = 1e-5
LIGHT_KM_S = 299792.458

HOST_HIGHEST = 0.5
HOST_WAVELENGTH_A = 5100
PECULIAR_KM_S = 300.0
CALIBRATION_DEX = 0.1


def log_luminosity(
    ab_mag: float, wavelength_a: float, redshift: float, rest_a: float, cosmology: Cosmology
) -> float:
    """Return log10 of lambda L_lambda in erg/s at rest wavelength `rest_a`.

    Parameters
    ----------
    ab_mag : float
        Apparent AB magnitude at the observed wavelength `wavelength_a` (angstrom), corrected for
        the Galaxy's extinction.
    redshift : float
        Above 0.
    rest_a : float
        Angstrom.
    cosmology : Cosmology
        Sets the luminosity distance.
    """
    distance_mpc = _luminosity_distance_mpc(redshift, cosmology)
    return _zero_point(wavelength_a, redshift, rest_a, distance_mpc) - 0.4 * ab_mag


def apparent_ab_mag(
    log_lum: float, rest_a: float, redshift: float, wavelength_a: float, cosmology: Cosmology
) -> float:
    """Return the apparent AB magnitude without extinction: the inverse of `log_luminosity`."""
    distance_mpc = _luminosity_distance_mpc(redshift, cosmology)
    return 2.5 * (_zero_point(wavelength_a, redshift, rest_a, distance_mpc) - log_lum)


def absolute_ab_mag(log_lum: float, rest_a: float, wavelength_a: float) -> float:
    """Return the AB magnitude at rest `wavelength_a` that the AGN would have at 10 pc.

    `log_lum` is log10 of lambda L_lambda in erg/s at rest `rest_a`; wavelengths in angstrom.
    """
    return 2.5 * (_zero_point(wavelength_a, 0.0, rest_a, TEN_PC_MPC) - log_lum)


def at_wavelength(log_lum: float, from_a: float, to_a: float) -> float:
    """Carry log10 of lambda L_lambda along the power law from one rest wavelength to another."""
    return log_lum + (1 + ALPHA_NU) * math.log10(from_a / to_a)


def host_fraction(target: Target, cosmology: Cosmology) -> float:
    """Return the host galaxy's share of the target's light, in [0, 1).

    As given, else a typical share for the luminosity of AGN and host at 5100 angstrom: Shen et al.
    (2011, ApJS 194, 45, eq. 1, from memory), a mean of quasars, but at most 0.5, which it reaches
    at log L = 43.9. Below, nearby Seyferts have shares of 0.2 to 0.8 and the formula does not hold.
    """
    if target.host_fraction is not None:
        return target.host_fraction
    if target.log_luminosity is None:
        return _typical_host(_total_log_luminosity(target, HOST_WAVELENGTH_A, cosmology))
    wavelength_a, log_agn = target.log_luminosity
    log_agn = at_wavelength(log_agn, wavelength_a, HOST_WAVELENGTH_A)
    share = HOST_HIGHEST
    for _ in range(40):  # the share changes slowly with luminosity: each pass gains a factor > 2
        share = _typical_host(log_agn - math.log10(1 - share))
    return share


def agn_log_luminosity(target: Target, rest_a: float, cosmology: Cosmology) -> float:
    """Return log10 of the AGN's lambda L_lambda in erg/s at `rest_a`, host and dust removed."""
    if target.log_luminosity is not None:
        wavelength_a, log_agn = target.log_luminosity
        return at_wavelength(log_agn, wavelength_a, rest_a)
    total = _total_log_luminosity(target, rest_a, cosmology)
    return total + math.log10(1 - host_fraction(target, cosmology))


def magnitude_in(target: Target, band: str, cosmology: Cosmology) -> float:
    """Return the apparent magnitude of AGN and host together, as seen through the Galaxy's dust.

    Parameters
    ----------
    target : Target
        With a magnitude, in this band or another, or a luminosity.
    band : str
        Key of `planner.agn.BANDS`; sets the scale (AB or Vega).
    cosmology : Cosmology
        Used only where the target has no magnitude.
    """
    to = BANDS[band]
    return ab_magnitude_at(target, to.pivot_a, cosmology) - to.ab_minus_vega_mag


def ab_magnitude_at(target: Target, wavelength_a: float, cosmology: Cosmology) -> float:
    """Return the AB magnitude of the continuum of AGN and host at an observed wavelength.

    As for `magnitude_in`; lines are left out.
    """
    if target.magnitude is not None:
        given = BANDS[target.magnitude.band]
        ab_mag = _unreddened_ab_mag(target) - 2.5 * ALPHA_NU * math.log10(
            given.pivot_a / wavelength_a
        )
    else:
        log_agn = agn_log_luminosity(target, HOST_WAVELENGTH_A, cosmology)
        log_total = log_agn - math.log10(1 - host_fraction(target, cosmology))
        ab_mag = apparent_ab_mag(
            log_total, HOST_WAVELENGTH_A, target.redshift, wavelength_a, cosmology
        )
    return ab_mag + extinction_mag(wavelength_a, target.ebv_mag)


def luminosity_error_dex(target: Target, cosmology: Cosmology) -> float:
    """Return the standard error of log10 of the AGN's luminosity.

    0.1 dex for the AGN's own variation and the photometry's calibration; for a luminosity from a
    magnitude also a peculiar velocity of 300 km/s, and 0.4 times a host fraction that was not
    given (0.2 dex for a share of one half). Common practice, no source.
    """
    if target.log_luminosity is not None:
        return CALIBRATION_DEX
    distance = 2 / math.log(10) * PECULIAR_KM_S / (LIGHT_KM_S * target.redshift)
    host = 0.4 * host_fraction(target, cosmology) if target.host_fraction is None else 0.0
    return math.hypot(CALIBRATION_DEX, distance, host)


def _given_magnitude(target: Target) -> tuple[Band, float]:
    if target.magnitude is None:
        raise InputError(f"target {target.name}: give a magnitude or a log_luminosity")
    return BANDS[target.magnitude.band], target.magnitude.value_mag


def _unreddened_ab_mag(target: Target) -> float:
    band, value_mag = _given_magnitude(target)
    return value_mag + band.ab_minus_vega_mag - extinction_mag(band.pivot_a, target.ebv_mag)


def _total_log_luminosity(target: Target, rest_a: float, cosmology: Cosmology) -> float:
    """Return log10 of lambda L_lambda of AGN and host together."""
    band, _ = _given_magnitude(target)
    ab_mag = _unreddened_ab_mag(target)
    return log_luminosity(ab_mag, band.pivot_a, target.redshift, rest_a, cosmology)


def _typical_host(log_total_5100: float) -> float:
    x = log_total_5100 - 44
    if x >= 1.053:
        return 0.0
    ratio = 0.8052 - 1.5502 * x + 0.9121 * x**2 - 0.1577 * x**3
    return min(HOST_HIGHEST, ratio / (1 + ratio))


def _zero_point(wavelength_a: float, redshift: float, rest_a: float, distance_mpc: float) -> float:
    """Return log10 of lambda L_lambda at `rest_a` of a source of AB magnitude 0.

    L_nu(nu_t) = 4 pi D^2 f_nu(nu_o) / (1+z) [nu_t / ((1+z) nu_o)]^alpha.
    """
    stretch = wavelength_a / ((1 + redshift) * rest_a)
    return (
        math.log10(4 * math.pi)
        + 2 * math.log10(distance_mpc * MPC_CM)
        - 0.4 * AB_ZERO_MAG
        - math.log10(1 + redshift)
        + ALPHA_NU * math.log10(stretch)
        + math.log10(LIGHT_A_S / rest_a)
    )


@lru_cache(maxsize=4096)
def _luminosity_distance_mpc(redshift: float, cosmology: Cosmology) -> float:
    return float(_distances(cosmology)(redshift).value)


@lru_cache(maxsize=16)
def _distances(cosmology: Cosmology) -> Callable[[float], Any]:
    """Return the cosmology's luminosity distance as a function of redshift; slow to build."""
    from astropy.cosmology import FlatLambdaCDM

    model = FlatLambdaCDM(H0=cosmology.hubble_km_s_mpc, Om0=cosmology.omega_matter)
    return model.luminosity_distance  # type: ignore[no-any-return]
