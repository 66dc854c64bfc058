"""What a schedule costs by telescope, stream and target: one charge a visit, so sums agree."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Campaign
from planner.model.plan import TimeSpent, Visit

__all__ = ["hours_by_target", "time_spent"]

VISIT, STANDARDS, MINIMUM = range(3)


def time_spent(
    campaign: Campaign, visits: Sequence[Visit], dark_hours: dict[str, float]
) -> tuple[TimeSpent, ...]:
    """Add up a schedule's time by telescope and stream.

    Parameters
    ----------
    campaign : Campaign
    visits : sequence of Visit
    dark_hours : dict of str to float
        By site: mean dark hours of the campaign's nights.
    """
    charges = _charges(campaign, visits)
    rows = []
    for stream in (campaign.line, campaign.continuum):
        for feed in stream.feeds:
            key = (feed.telescope, stream.kind)
            at = [i for i, v in enumerate(visits) if (v.telescope, v.stream) == key]
            spent = charges[at].sum(axis=0)
            dark = dark_hours[campaign.site(feed.telescope).name]
            rows.append(
                TimeSpent(
                    telescope=feed.telescope,
                    stream=stream.kind,
                    visits=len(at),
                    nights=len({visits[i].night for i in at}),
                    shutter_hours=sum(visits[i].exposure_s for i in at) / 3600,
                    visit_hours=float(spent[VISIT]),
                    standards_hours=float(spent[STANDARDS]),
                    minimum_hours=float(spent[MINIMUM]),
                    clock_hours=float(spent.sum()),
                    whole_nights=float(spent.sum()) / dark if dark else 0.0,
                )
            )
    return tuple(rows)


def hours_by_target(campaign: Campaign, visits: Sequence[Visit]) -> dict[str, float]:
    """Return the clock hours that each scheduled target is charged; they add up to the whole."""
    hours: dict[str, float] = defaultdict(float)
    for visit, charge in zip(visits, _charges(campaign, visits), strict=True):
        hours[visit.target] += float(charge.sum())
    return dict(hours)


def _charges(campaign: Campaign, visits: Sequence[Visit]) -> NDArray[np.float64]:
    """Return each visit's hours, its share of standard stars and of the nightly least.

    A night's standard stars are shared evenly between a stream's visits on a telescope; what is
    charged for a night shorter than the telescope's least is shared by the hours worked.
    """
    standards = {
        (feed.telescope, stream.kind): feed.standards_s / 3600
        for stream in (campaign.line, campaign.continuum)
        for feed in stream.feeds
    }
    charges = np.zeros((len(visits), 3))
    of_night: dict[tuple[str, int], list[int]] = defaultdict(list)
    for i, v in enumerate(visits):
        charges[i, VISIT] = (v.end_mjd - v.start_mjd) * 24
        of_night[v.telescope, v.night].append(i)
    for (telescope, _), rows in of_night.items():
        for kind in ("line", "continuum"):
            mine = [i for i in rows if visits[i].stream == kind]
            if mine:
                charges[mine, STANDARDS] = standards[telescope, kind] / len(mine)
        worked = charges[rows].sum(axis=1)
        missing = campaign.telescope(telescope).time.least_hours_per_night - worked.sum()
        charges[rows, MINIMUM] = max(0.0, missing) * worked / worked.sum()
    return charges
