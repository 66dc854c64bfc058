"""Light curves: variability, response and noise, simulated exactly at the epochs asked for.

In: epochs in observed-frame days, the walk's amplitude and timescale, the response's lag and
width, flux errors, random deviates, and what goes otherwise than usual. Out: the continuum's and
the line's fluxes over their means. A damped random walk and a top-hat response are exact; other
drivers and responses come from a fine grid. Nothing here knows how epochs come about or how lags
are recovered.
"""

from planner.lightcurves.disturbed import draw_disturbed_pair
from planner.lightcurves.driver import draw_pair
from planner.lightcurves.fluxes import FRACTION_PER_MAG, continuum_flux, line_flux
from planner.lightcurves.noise import disturbed_noise

__all__ = [
    "FRACTION_PER_MAG",
    "continuum_flux",
    "disturbed_noise",
    "draw_disturbed_pair",
    "draw_pair",
    "line_flux",
]
