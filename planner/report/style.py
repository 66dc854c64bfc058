"""How all figures look, and how they become PNG."""

from __future__ import annotations

import io
from typing import Any

from matplotlib import rc_context
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

__all__ = ["BLUE", "GREEN", "GREY", "INK", "ORANGE", "SHADES", "VERMILION", "new_figure", "png"]

# Okabe & Ito's colours, told apart by all common kinds of colour vision.
BLUE, ORANGE, GREEN, VERMILION = "#0072B2", "#E69F00", "#009E73", "#D55E00"
INK, GREY = "#222222", "#8a8a8a"
SHADES = "cividis"

_STYLE: Any = {
    "font.size": 9,
    "axes.titlesize": 9,
    "axes.labelsize": 9,
    "axes.edgecolor": INK,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "legend.frameon": False,
    "legend.fontsize": 8,
    "figure.dpi": 110,
}


def new_figure(width_in: float, height_in: float) -> Figure:
    """Return an empty figure in the house style; the user's own settings stay as they are."""
    with rc_context(_STYLE):
        figure = Figure(figsize=(width_in, height_in), layout="constrained")
        FigureCanvasAgg(figure)
    return figure


def styled() -> Any:
    """Return the context in which axes are made and drawn."""
    return rc_context(_STYLE)


def png(figure: Figure) -> bytes:
    """Return a figure as PNG, the same bytes from run to run."""
    buffer = io.BytesIO()
    with rc_context(_STYLE):
        figure.savefig(buffer, format="png", dpi=110, metadata={"Software": None})
    return buffer.getvalue()
