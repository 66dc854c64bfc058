"""Light curves: variability, response and noise, simulated exactly at the epochs asked for.

In: epochs in observed-frame days, the walk's amplitude and timescale, the response's lag and
width, flux errors, random deviates. Out: the continuum's and the line's fluxes over their means.
Nothing here knows how epochs come about or how lags are recovered.
"""

from planner.lightcurves.driver import draw_pair
from planner.lightcurves.observed import observed_continuum, observed_line

__all__ = ["draw_pair", "observed_continuum", "observed_line"]
