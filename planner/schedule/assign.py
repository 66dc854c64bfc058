"""The most overdue visit first, night after night."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Campaign
from planner.model.observatory import TimeAllotment
from planner.model.plan import Unplaced, Visit
from planner.schedule.ledger import Ledgers
from planner.schedule.requests import Request

__all__ = ["assign", "planned", "used_nights"]

Usable = Mapping[str, NDArray[np.bool_]]
"""By telescope: whether each night, counted from the campaign's first, is usable."""

SECONDS_PER_DAY = 86400.0


def assign(
    campaign: Campaign, requests: Sequence[Request], usable: Usable | None = None
) -> list[Visit]:
    """Assign visits to nights and times.

    On each night, the visits that are due are ranked by how many cadences have passed since the
    last one, times the target's priority; each is put as near to its least airmass as its window
    and the telescope's other visits leave room for. A visit that finds no room stays due.

    Parameters
    ----------
    campaign : Campaign
    requests : sequence of Request
    usable : mapping of str to (nights,) bool arrays, optional
        Usable nights of each telescope: a simulated sky gives what the campaign would really get.
        None: the plan for clear skies.

    Returns
    -------
    list of Visit
        In order of night, then start.
    """
    ledgers = Ledgers(campaign)
    due = [float(r.first[0]) for r in requests]
    season = [0] * len(requests)
    by_night = _index_by_night(requests)
    visits: list[Visit] = []
    for night in sorted(by_night):
        ledgers.new_night()
        ranked = []
        for r, row in by_night[night]:
            request = requests[r]
            while night > request.last[season[r]]:
                season[r] += 1
                due[r] = float(request.first[season[r]])
            if night >= due[r] and (usable is None or usable[request.telescope][night]):
                overdue = (night - due[r]) / request.cadence_nights + 1
                ranked.append((-overdue * request.priority, r, row))
        tonight = []
        for _, r, row in sorted(ranked):
            request = requests[r]
            visit = _fit(request, row, night, ledgers)
            if visit is not None:
                tonight.append(visit)
                late = night - due[r]
                due[r] = (due[r] if late < 1 else night) + request.cadence_nights
        visits += sorted(tonight, key=lambda v: (v.start_mjd, v.telescope))
    return visits


def _index_by_night(requests: Sequence[Request]) -> dict[int, list[tuple[int, int]]]:
    """Return, for each night, (request, row of its nights) of every window inside a season."""
    by_night: dict[int, list[tuple[int, int]]] = {}
    for r, request in enumerate(requests):
        night = request.nights.night
        inside = np.zeros(night.size, dtype=bool)
        for first, last in zip(request.first, request.last, strict=True):
            inside |= (night >= first) & (night <= last)
        for row in np.flatnonzero(inside):
            by_night.setdefault(int(night[row]), []).append((r, int(row)))
    return by_night


def _fit(request: Request, row: int, night: int, ledgers: Ledgers) -> Visit | None:
    """Book the free time nearest to the wanted one, or return None."""
    nights = request.nights
    length = nights.visit_s / SECONDS_PER_DAY
    standards_h = nights.standards_s / 3600
    if not ledgers.allows(request.telescope, request.stream, length * 24, standards_h):
        return None
    booked = ledgers.booked[request.telescope]
    earliest = float(nights.window_start_mjd[row])
    latest = float(nights.window_end_mjd[row]) - length
    wanted = float(nights.best_mjd[row]) - length / 2
    wanted = min(max(wanted, earliest), latest)
    starts = [wanted]
    for booked_start, booked_end in booked:
        starts += [booked_start - length, booked_end]
    free = [
        s
        for s in starts
        if earliest <= s <= latest
        and all(s + length <= b_start + _TOUCH or s >= b_end - _TOUCH for b_start, b_end in booked)
    ]
    if not free:
        return None
    start = min(free, key=lambda s: (abs(s - wanted), s))
    ledgers.book(request.telescope, request.stream, start, start + length, standards_h)
    return Visit(
        night=night,
        target=request.target,
        stream=request.stream,
        telescope=request.telescope,
        start_mjd=start,
        end_mjd=start + length,
        exposure_s=nights.exposure_s,
    )


_TOUCH = 1e-9
"""Days (0.1 ms) by which two visits may touch, against rounding."""


def planned(campaign: Campaign, requests: Sequence[Request]) -> tuple[list[Visit], list[Unplaced]]:
    """Return the schedule for clear skies, and the requests that did not get all their visits."""
    visits = assign(campaign, requests)
    unplaced = []
    for request in requests:
        alone = assign(_unlimited(campaign), [request])
        mine = (request.target, request.stream, request.telescope)
        placed = sum((v.target, v.stream, v.telescope) == mine for v in visits)
        if placed < len(alone):
            unplaced.append(
                Unplaced(
                    target=request.target,
                    stream=request.stream,
                    telescope=request.telescope,
                    wanted=len(alone),
                    placed=placed,
                    reason=f"no more time on {request.telescope} on the nights when it was due",
                )
            )
    return visits, unplaced


def _unlimited(campaign: Campaign) -> Campaign:
    """Return the campaign with nothing but windows limiting its telescopes."""
    free = TimeAllotment()
    return replace(
        campaign,
        telescopes=tuple(replace(t, time=free) for t in campaign.telescopes),
        line=replace(campaign.line, time=free),
        continuum=replace(campaign.continuum, time=free),
    )


def used_nights(requests: Sequence[Request], visits: Sequence[Visit]) -> list[NDArray[np.bool_]]:
    """Return, for each request, which of its nights on offer the visits used."""
    rows = {
        (r.target, r.stream, r.telescope): dict(
            zip(r.nights.night.tolist(), range(r.nights.night.size), strict=True)
        )
        for r in requests
    }
    used = {key: np.zeros(len(of_night), dtype=bool) for key, of_night in rows.items()}
    for visit in visits:
        key = (visit.target, visit.stream, visit.telescope)
        used[key][rows[key][visit.night]] = True
    return [used[r.target, r.stream, r.telescope] for r in requests]
