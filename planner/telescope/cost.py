"""Clock time."""

from __future__ import annotations

from planner.model.observatory import Stream, Telescope

__all__ = ["cost_h", "visit_s"]


def visit_s(stream: Stream, telescope: Telescope) -> float:
    """Return the clock time of one visit in seconds: slew, exposure and the stream's overhead."""
    return telescope.slew_s + stream.exposure_s + stream.overhead_s


def cost_h(visits: float, stream: Stream, telescope: Telescope) -> float:
    """Return the clock hours of a number of visits."""
    return visits * visit_s(stream, telescope) / 3600
