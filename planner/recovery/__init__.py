"""Lag recovery: what an observer would conclude from two light curves.

In: times (observed-frame days), fluxes and errors of a continuum and a line, a grid of lags, a
random stream for the resampling. Out: correlation function, lag with its 68 % interval or the
reason why there is none, claim or not, likelihood. The true lag enters only in `is_right`.
"""

from planner.recovery.correlation import centroid, correlation
from planner.recovery.cuts import is_claim, is_right, passes_cuts
from planner.recovery.join import joined
from planner.recovery.lag import LagResult, recover_lag
from planner.recovery.likelihood import drw_log_likelihood
from planner.recovery.search import lag_grid, minimum_overlap, search_range

__all__ = [
    "LagResult",
    "centroid",
    "correlation",
    "drw_log_likelihood",
    "is_claim",
    "is_right",
    "joined",
    "lag_grid",
    "minimum_overlap",
    "passes_cuts",
    "recover_lag",
    "search_range",
]
