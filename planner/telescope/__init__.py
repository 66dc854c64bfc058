"""What one epoch costs and how well it measures.

In: a feed's instrument, its telescope, a target's magnitude, exposure, air and sky; for lines also
their strength and width. Out: fractional flux errors, signal-to-noise, the exposure that reaches
an error, clock time. Nothing here is random, and nothing is known of targets, sites or dates
beyond those numbers. The noise model stands in `rates`.
"""

from planner.telescope.conditions import Conditions
from planner.telescope.cost import visit_s
from planner.telescope.errors import (
    image_error,
    line_error,
    signal_to_noise,
    spectral_continuum_error,
)
from planner.telescope.exposure import exposure_for

__all__ = [
    "Conditions",
    "exposure_for",
    "image_error",
    "line_error",
    "signal_to_noise",
    "spectral_continuum_error",
    "visit_s",
]
