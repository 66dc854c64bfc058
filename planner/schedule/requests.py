"""What each target asks of each telescope."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Campaign, Layout
from planner.model.observatory import Stream
from planner.model.trial import Prospect, StreamNights
from planner.scoring import place

__all__ = ["Request", "requests_of"]


@dataclass(frozen=True, slots=True)
class Request:
    """Repeated visits of one target in one stream."""

    target: str
    stream: str
    telescope: str
    cadence_nights: float
    first: NDArray[np.int64]
    """First night of each observing season."""
    last: NDArray[np.int64]
    nights: StreamNights
    exposure_s: float
    priority: float


def requests_of(campaign: Campaign, chosen: list[tuple[Prospect, Layout]]) -> tuple[Request, ...]:
    """Return two requests, line and continuum, for each target with a chosen layout."""
    priority = {t.name: t.priority for t in campaign.targets}
    requests = []
    for prospect, layout in chosen:
        placing = place(layout, prospect.seasons, prospect.line)
        parts: tuple[tuple[Stream, StreamNights, float], ...] = (
            (campaign.line, prospect.line, layout.cadence_line_nights),
            (campaign.continuum, prospect.continuum, layout.cadence_continuum_nights),
        )
        for stream, nights, cadence in parts:
            requests.append(
                Request(
                    target=prospect.forecast.name,
                    stream=stream.kind,
                    telescope=stream.telescope,
                    cadence_nights=cadence,
                    first=placing.first,
                    last=placing.last,
                    nights=nights,
                    exposure_s=stream.exposure_s,
                    priority=priority[prospect.forecast.name],
                )
            )
    return tuple(requests)
