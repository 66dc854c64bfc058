"""What to expect of one AGN: luminosity, lag, variability, mass, brightness in any band.

In: a target's record, the relations chosen for each line, a cosmology. Out: a `Forecast`, and
magnitudes of the target in other bands for the signal-to-noise of each stream.
Lags come out of radius-luminosity relations in the rest frame; only `Forecast.lag_obs_d` and
`Forecast.timescale_obs_d` are in the observer's. Nothing here is random.
"""

from planner.agn.bands import BANDS, Band
from planner.agn.forecast import forecast
from planner.agn.lines import LINES, Line, default_line
from planner.agn.luminosity import (
    ab_magnitude_at,
    agn_log_luminosity,
    host_fraction,
    magnitude_in,
)
from planner.agn.mass import log_mass, log_virial_product, mass_error_dex
from planner.agn.relations import RELATIONS, Relation, lag_rest, relation_names
from planner.agn.variability import damped_random_walk

__all__ = [
    "BANDS",
    "LINES",
    "RELATIONS",
    "Band",
    "Line",
    "Relation",
    "ab_magnitude_at",
    "agn_log_luminosity",
    "damped_random_walk",
    "default_line",
    "forecast",
    "host_fraction",
    "lag_rest",
    "log_mass",
    "log_virial_product",
    "magnitude_in",
    "mass_error_dex",
    "relation_names",
]
