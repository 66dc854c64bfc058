"""What people look at: figures and the HTML page.

In: a plan. Out: PNG figures and one self-contained page that opens with no network. Colours are
safe for colour-blind eyes and doubled by shape or label; every figure carries its numbers' units.
"""

from planner.report.figures import (
    ambiguity_figure,
    example_figure,
    recovery_figure,
    success_figure,
    visibility_figure,
)
from planner.report.page import page
from planner.report.style import png
from planner.report.trace import Step, trace

__all__ = [
    "Step",
    "ambiguity_figure",
    "example_figure",
    "page",
    "png",
    "recovery_figure",
    "success_figure",
    "trace",
    "visibility_figure",
]
