"""Clock time."""

from __future__ import annotations

from planner.model.observatory import Feed, Telescope

__all__ = ["visit_s"]


def visit_s(feed: Feed, telescope: Telescope, exposure_s: float) -> float:
    """Return the clock time of one visit in seconds.

    Slew, acquisition, the feed's overhead, shutter time and the read-out of every frame. Standard
    stars are a matter of the night, not of the visit.
    """
    return (
        telescope.slew_s
        + telescope.acquisition_s
        + feed.overhead_s
        + exposure_s
        + feed.exposures * feed.read_out_s
    )
