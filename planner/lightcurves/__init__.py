"""Light curves: variability, response and noise, simulated exactly at the epochs asked for.

In: epochs in observed-frame days, the walk's amplitude and timescale, the response's lag and
width, flux errors, random deviates. Out: the continuum's and the line's fluxes over their means.
Nothing here knows how epochs come about or how lags are recovered.
"""

from planner.lightcurves.driver import draw_pair
from planner.lightcurves.fluxes import continuum_flux, line_flux

__all__ = ["continuum_flux", "draw_pair", "line_flux"]
