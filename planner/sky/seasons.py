"""Seasons: runs of nights in which a target can be observed."""

from __future__ import annotations

import numpy as np

from planner.model.sky import Nights, Season, Windows

__all__ = ["seasons_of"]


def seasons_of(
    windows: Windows, nights: Nights, min_hours: float = 0.0, bridge_nights: int = 15
) -> list[Season]:
    """Return the seasons of every target that has one, by target, then in time.

    Parameters
    ----------
    windows : Windows
        Windows of one site, as from `windows_of` (or those of them that telescope time leaves).
    nights : Nights
        The nights that the windows' indices count.
    min_hours : float
        A night counts if its windows of the target add up to at least this many hours.
    bridge_nights : int
        A run of at most this many nights that do not count does not end a season: the moon passes
        near a target every month, and nights may be blocked. The moon needs about 9 nights to
        cross a circle of 60 degrees' radius.

    Returns
    -------
    list of Season
        `nights` counts those with enough hours, not the bridged ones. The gap of the last season
        lasts until the campaign's end.
    """
    seasons: list[Season] = []
    starts = np.searchsorted(windows.target, np.unique(windows.target))
    for rows in np.split(np.arange(windows.target.size), starts[1:]):
        if rows.size:
            hours = 24.0 * (windows.end_mjd[rows] - windows.start_mjd[rows])
            total = np.bincount(windows.night[rows], weights=hours, minlength=nights.night.size)
            seasons += _runs(
                int(windows.target[rows[0]]),
                np.flatnonzero((total > 0.0) & (total >= min_hours)),
                nights.night.size,
                bridge_nights,
            )
    return seasons


def _runs(
    target: int, usable: np.ndarray[tuple[int], np.dtype[np.intp]], n_nights: int, bridge: int
) -> list[Season]:
    """Split the usable nights of one target where more than `bridge` nights are missing."""
    if not usable.size:
        return []
    runs = np.split(usable, np.flatnonzero(np.diff(usable) > bridge + 1) + 1)
    next_first = [int(run[0]) for run in runs[1:]] + [n_nights]
    return [
        Season(target, int(run[0]), int(run[-1]), run.size, after - int(run[-1]) - 1)
        for run, after in zip(runs, next_first, strict=True)
    ]
