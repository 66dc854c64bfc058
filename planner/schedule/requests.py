"""What each target asks of each telescope."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Campaign, Layout
from planner.model.trial import FeedNights, Prospect
from planner.scoring import place_in

__all__ = ["Request", "requests_of"]


@dataclass(frozen=True, slots=True)
class Request:
    """Repeated visits of one target by one telescope in one stream."""

    target: str
    stream: str
    feed: int
    """Number of the telescope in its stream, from 0."""
    cadence_nights: float
    first: NDArray[np.int64]
    """First night of each observing season."""
    last: NDArray[np.int64]
    nights: FeedNights
    priority: float

    @property
    def telescope(self) -> str:
        """Where the visits are made."""
        return self.nights.telescope


def requests_of(campaign: Campaign, chosen: list[tuple[Prospect, Layout]]) -> tuple[Request, ...]:
    """Return one request for each telescope of both streams and each target with a layout.

    A continuum that comes with the line's spectra asks for no visits of its own.
    """
    priority = {t.name: t.priority for t in campaign.targets}
    requests = []
    for prospect, layout in chosen:
        placing = place_in(prospect, layout)
        for kind, feeds, cadence in (
            ("line", prospect.line, layout.cadence_line_nights),
            ("continuum", prospect.continuum, layout.cadence_continuum_nights),
        ):
            for number, nights in enumerate(feeds):
                if nights.in_spectra_of is None:
                    requests.append(
                        Request(
                            target=prospect.forecast.name,
                            stream=kind,
                            feed=number,
                            cadence_nights=cadence,
                            first=placing.first,
                            last=placing.last,
                            nights=nights,
                            priority=priority[prospect.forecast.name],
                        )
                    )
    return tuple(requests)
