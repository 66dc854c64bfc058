"""What one visit costs and how well it measures.

In: an instrument's known signal-to-noise, a target's magnitude, exposure and airmass; for lines
also their strength and width. Out: fractional flux errors of one visit in either stream, and
clock time. Nothing here is random, and nothing is known of targets beyond those numbers.
"""

from planner.telescope.cost import cost_h, visit_s
from planner.telescope.errors import flux_error, line_flux_error

__all__ = ["cost_h", "flux_error", "line_flux_error", "visit_s"]
