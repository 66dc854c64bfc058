"""Lag recovery: what an observer would conclude from two light curves.

In: times (observed-frame days), fluxes and errors of a continuum and a line, a grid of lags, a
random stream for the resampling. Out: correlation function, lag with its 68 % interval or the
reason why there is none, claim or not, likelihood. The true lag enters only in `is_right`.
"""

from planner.recovery.ambiguity import Ambiguity, ambiguity
from planner.recovery.correlation import centroid, correlation
from planner.recovery.cuts import is_claim, is_right, passes_cuts
from planner.recovery.density import Alias
from planner.recovery.discrete import (
    DiscreteCorrelation,
    DiscreteLag,
    discrete_correlation,
    discrete_lag,
)
from planner.recovery.expected import Expected, expected_recovery
from planner.recovery.information import (
    Design,
    FisherForecast,
    fisher_forecast,
    knapp_carter_error,
    make_design,
)
from planner.recovery.join import joined
from planner.recovery.joint import joint_log_likelihood, make_pair
from planner.recovery.lag import LagResult, peak_correlation, recover_lag
from planner.recovery.likelihood import drw_log_likelihood
from planner.recovery.posterior import Belief, LagPosterior, lag_posterior
from planner.recovery.response import Response
from planner.recovery.search import lag_grid, minimum_overlap, search_range
from planner.recovery.walk_nodes import walk_nodes

__all__ = [
    "Alias",
    "Ambiguity",
    "Belief",
    "Design",
    "DiscreteCorrelation",
    "DiscreteLag",
    "Expected",
    "FisherForecast",
    "LagPosterior",
    "LagResult",
    "Response",
    "ambiguity",
    "centroid",
    "correlation",
    "discrete_correlation",
    "discrete_lag",
    "drw_log_likelihood",
    "expected_recovery",
    "fisher_forecast",
    "is_claim",
    "is_right",
    "joined",
    "joint_log_likelihood",
    "knapp_carter_error",
    "lag_grid",
    "lag_posterior",
    "make_design",
    "make_pair",
    "minimum_overlap",
    "passes_cuts",
    "peak_correlation",
    "recover_lag",
    "search_range",
    "walk_nodes",
]
