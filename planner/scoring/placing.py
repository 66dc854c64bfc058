"""Where in the visible seasons of a target a layout is put."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.sky import Season
from planner.model.trial import FeedNights, Prospect

__all__ = ["Placing", "by_year", "place", "place_in"]

SHORT = 0.9
"""A season that holds less than this share of the wanted length is noted as cut short."""

YEAR_NIGHTS = 365


@dataclass(frozen=True, slots=True)
class Placing:
    """First and last night of each observing season; empty arrays where the layout cannot be."""

    first: NDArray[np.int64]
    last: NDArray[np.int64]
    note: str


def place_in(prospect: Prospect, layout: Layout) -> Placing:
    """Put a layout's observing seasons into those of a prospect; see `place`."""
    if not prospect.seasons:
        none = np.empty(0, dtype=np.int64)
        return Placing(none, none, prospect.note)
    return place(layout, prospect.seasons, prospect.line[0])


def place(layout: Layout, seasons: Sequence[Season], line: FeedNights) -> Placing:
    """Put a layout's observing seasons into a target's visible ones.

    Of all runs of consecutive visible seasons, the run that holds the most of the wanted length is
    taken, the earliest of equals. Within a visible season the stretch with the most hours of
    window is taken, the one nearest the middle of equals; a layout's shift moves it, as far as the
    visible season goes. A target visible for years on end has one season a year.

    Parameters
    ----------
    layout : Layout
    seasons : sequence of Season
        The target's visible seasons, in time order.
    line : FeedNights
        Nights on offer on the line's main telescope.
    """
    none = np.empty(0, dtype=np.int64)
    seasons = by_year(seasons)
    if layout.seasons > len(seasons):
        return Placing(none, none, f"the campaign holds {_count(len(seasons))} of this target")
    wanted = round(layout.season_length_d)
    lengths = np.array([min(s.last - s.first + 1, wanted) for s in seasons])
    held = np.convolve(lengths, np.ones(layout.seasons, dtype=np.int64), mode="valid")
    start = int(np.argmax(held))
    chosen = seasons[start : start + layout.seasons]
    spans = [_shifted(_best_stretch(s, wanted, line), s, round(layout.shift_d)) for s in chosen]
    first = np.array([a for a, _ in spans], dtype=np.int64)
    last = np.array([b for _, b in spans], dtype=np.int64)
    shortest = int((last - first + 1).min())
    note = f"season is {shortest} d" if shortest < SHORT * wanted else ""
    return Placing(first, last, note)


def by_year(seasons: Sequence[Season]) -> list[Season]:
    """Return the seasons, one that goes on for years cut into equal parts of about a year."""
    parts = []
    for s in seasons:
        nights = s.last - s.first + 1
        years = max(1, round(nights / YEAR_NIGHTS))
        edges = [s.first + round(i * nights / years) for i in range(years + 1)]
        parts += [replace(s, first=first, last=end - 1) for first, end in pairwise(edges)]
    return parts


def _count(seasons: int) -> str:
    return "one season" if seasons == 1 else f"{seasons} seasons"


def _shifted(stretch: tuple[int, int], season: Season, nights: int) -> tuple[int, int]:
    """Move a stretch within its visible season."""
    nights = min(max(nights, season.first - stretch[0]), season.last - stretch[1])
    return stretch[0] + nights, stretch[1] + nights


def _best_stretch(season: Season, wanted: int, line: FeedNights) -> tuple[int, int]:
    """Return first and last night of the best stretch of at most `wanted` nights."""
    nights = season.last - season.first + 1
    if nights <= wanted:
        return season.first, season.last
    hours = np.zeros(nights)
    inside = (line.night >= season.first) & (line.night <= season.last)
    hours[line.night[inside] - season.first] = (
        line.window_end_mjd[inside] - line.window_start_mjd[inside]
    )
    total = np.concatenate(([0.0], np.cumsum(hours)))
    held = total[wanted:] - total[:-wanted]
    off_centre = np.abs(np.arange(held.size) - (nights - wanted) / 2)
    # Rounding keeps sums that are equal in life from being told apart by their last digits.
    best = np.lexsort((off_centre, -np.round(held, 6)))[0]
    return season.first + int(best), season.first + int(best) + wanted - 1
