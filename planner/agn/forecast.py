"""Everything that is expected of one target, in one record."""

from __future__ import annotations

import math
from collections.abc import Mapping

from planner.agn.bands import BANDS
from planner.agn.lines import DEFAULT_WIDTH_KM_S, LINES, default_line
from planner.agn.luminosity import agn_log_luminosity, host_fraction, luminosity_error_dex
from planner.agn.mass import log_mass, mass_error_dex
from planner.agn.relations import RELATIONS, Relation, lag_rest
from planner.agn.variability import (
    AMPLITUDE_SCATTER_DEX,
    TIMESCALE_SCATTER_DEX,
    absolute_i_mag,
    damped_random_walk,
)
from planner.base.errors import InputError
from planner.model.campaign import Cosmology
from planner.model.target import Forecast, Target

__all__ = ["forecast"]

NEW_AGN_SCATTER_DEX = 0.23
"""No relation is trusted to predict a new AGN better than this. The classic scatter, 0.13 to 0.19
dex, is that of well-studied AGN; 0.23 was found when new ones were added (Malik et al. 2023)."""
GIVEN_LAG_SCATTER_DEX = 0.1
"""A known lag comes out longer or shorter from year to year (common practice, no source)."""


def forecast(
    target: Target,
    *,
    band: str,
    relations: Mapping[str, str],
    cosmology: Cosmology,
    error_below: float,
) -> Forecast:
    """Return what is expected of one target.

    Parameters
    ----------
    target : Target
        With a magnitude or a luminosity, and a redshift above 0.
    band : str
        Band of the continuum stream, a key of `planner.agn.BANDS`: the variability expected
        depends on the rest wavelength that is watched.
    relations : mapping
        Key of the radius-luminosity relation chosen for a line; a line left out, or with an empty
        key, has its default. For H beta that is ``duwang2019`` where the iron strength of the
        target is known, else ``bentz2013``.
    cosmology : Cosmology
        Sets distances.
    error_below : float
        Fractional error of the lag that the success rule asks for; sets the mass's error.

    Raises
    ------
    InputError
        If the relation chosen is not known for the line, or needs an iron strength that the target
        does not give.

    Notes
    -----
    Lag: log-normal about the relation. Its scatter is the relation's own, but at least 0.23 dex,
    in quadrature with the luminosity's error times the slope; 0.1 dex about a lag that is given.
    Amplitude and timescale that are given are taken at their word, without scatter. A given mass
    goes into the variability's scalings; without one the virial mass expected does.
    """
    line = target.line or default_line(target.redshift)
    relation = _relation_for(target, line, relations)
    log_lum = agn_log_luminosity(target, relation.wavelength_a, cosmology)
    lag_rest_d, lag_scatter_dex = _lag_prior(target, relation, log_lum, cosmology)
    width_km_s = target.line_width_km_s or DEFAULT_WIDTH_KM_S
    mass = log_mass(lag_rest_d, width_km_s) if target.log_mass is None else target.log_mass
    amplitude_mag, timescale_rest_d = damped_random_walk(
        BANDS[band].pivot_a / (1 + target.redshift),
        absolute_i_mag(log_lum, relation.wavelength_a),
        mass,
    )
    agn_fraction = 1 - host_fraction(target, cosmology)
    known_amplitude, known_timescale = target.amplitude_mag, target.timescale_rest_d
    return Forecast(
        name=target.name,
        line=line,
        relation=relation.key if target.lag_rest_d is None else "given",
        log_luminosity=log_lum,
        luminosity_wavelength_a=relation.wavelength_a,
        lag_rest_d=lag_rest_d,
        lag_obs_d=lag_rest_d * (1 + target.redshift),
        lag_scatter_dex=lag_scatter_dex,
        amplitude_mag=amplitude_mag if known_amplitude is None else known_amplitude,
        amplitude_scatter_dex=AMPLITUDE_SCATTER_DEX if known_amplitude is None else 0.0,
        timescale_obs_d=(1 + target.redshift)
        * (timescale_rest_d if known_timescale is None else known_timescale),
        timescale_scatter_dex=TIMESCALE_SCATTER_DEX if known_timescale is None else 0.0,
        agn_fraction=agn_fraction,
        log_mass=mass,
        mass_dex=mass_error_dex(error_below),
        line_width_km_s=width_km_s,
        line_equivalent_width_a=(
            LINES[line].equivalent_width_rest_a * agn_fraction
            if target.line_equivalent_width_a is None
            else target.line_equivalent_width_a
        ),
        outside_range=not relation.lowest <= log_lum <= relation.highest,
    )


def _relation_for(target: Target, line: str, chosen: Mapping[str, str]) -> Relation:
    """Return the relation to use, or say why it cannot be."""
    known = RELATIONS[line]
    if key := chosen.get(line):
        if key not in known:
            raise InputError(f"no relation {key} for {line}; choose among {', '.join(known)}")
        relation = known[key]
    elif line == "Hbeta" and target.iron_strength is not None:
        relation = known["duwang2019"]
    else:
        relation = next(iter(known.values()))
    if relation.iron_slope and target.iron_strength is None and target.lag_rest_d is None:
        raise InputError(
            f"target {target.name}: the relation {relation.key} needs its iron_strength; "
            "give it, or choose another relation"
        )
    return relation


def _lag_prior(
    target: Target, relation: Relation, log_lum: float, cosmology: Cosmology
) -> tuple[float, float]:
    """Return the median rest-frame lag in days and the scatter of its log10."""
    if target.lag_rest_d is not None:
        return target.lag_rest_d, GIVEN_LAG_SCATTER_DEX
    scatter_dex = math.hypot(
        max(relation.scatter_dex, NEW_AGN_SCATTER_DEX),
        relation.slope * luminosity_error_dex(target, cosmology),
    )
    return lag_rest(relation, log_lum, target.iron_strength or 0.0), scatter_dex
