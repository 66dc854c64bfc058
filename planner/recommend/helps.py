"""What would help most where no layout reaches the goal: changes, tried with the same draws."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from planner.model.campaign import Campaign, Layout
from planner.model.observatory import Stream
from planner.model.plan import Help
from planner.model.trial import FeedNights, Prospect, Score

__all__ = ["Change", "changes_for", "helps_of"]

YEAR_D = 365
DEEPER = 4.0


@dataclass(frozen=True, slots=True)
class Change:
    """One change to a campaign and layout, described in words."""

    words: str
    campaign: Campaign
    layout: Layout


def changes_for(campaign: Campaign, best: Score, prospect: Prospect) -> tuple[Change, ...]:
    """Return the changes worth trying on the best layout of a target that misses the goal.

    Twice as many visits in either stream (not beyond one a night), exposures four times as long in
    either stream, a season half as long again, and one season more, for which the campaign is
    extended by a year where needed.
    """
    layout = best.layout
    changes = []
    denser = max(1.0, layout.cadence_line_nights / 2)
    if denser < layout.cadence_line_nights:
        changes.append(
            Change(
                f"spectra every {_nights(denser)}",
                campaign,
                replace(
                    layout,
                    cadence_line_nights=denser,
                    cadence_continuum_nights=min(layout.cadence_continuum_nights, denser),
                ),
            )
        )
    denser = max(1.0, layout.cadence_continuum_nights / 2)
    if campaign.continuum.feeds and denser < layout.cadence_continuum_nights:
        changes.append(
            Change(
                f"imaging every {_nights(denser)}",
                campaign,
                replace(layout, cadence_continuum_nights=denser),
            )
        )
    words, deeper = _deeper(campaign.line, prospect.line)
    changes.append(Change(f"spectra {words}", replace(campaign, line=deeper), layout))
    if campaign.continuum.feeds:
        words, deeper = _deeper(campaign.continuum, prospect.continuum)
        changes.append(Change(f"images {words}", replace(campaign, continuum=deeper), layout))
    longer = 1.5 * layout.season_length_d
    changes.append(
        Change(f"seasons of {longer:.0f} d", campaign, replace(layout, season_length_d=longer))
    )
    more = layout.seasons + 1
    changes.append(
        Change(
            f"{more} seasons, the campaign a year longer",
            replace(campaign, last_night=campaign.last_night + YEAR_D),
            replace(layout, seasons=more),
        )
    )
    return tuple(changes)


def _deeper(stream: Stream, nights: Sequence[FeedNights]) -> tuple[str, Stream]:
    """Return a stream with exposures four times as long as the target's now, and that in words."""
    feeds = tuple(
        replace(feed, exposure_s=now.exposure_s * DEEPER)
        for feed, now in zip(stream.feeds, nights, strict=False)  # spectra have no visits to deepen
    )
    exposure = nights[0].exposure_s * DEEPER
    words = f"of {exposure / 60:.3g} min" if exposure >= 60 else f"of {exposure:.3g} s"
    return words, replace(stream, feeds=feeds)


def _nights(cadence: float) -> str:
    return "night" if cadence == 1 else f"{cadence:g} nights"


def helps_of(base: Score, tried: Sequence[tuple[Change, Score]]) -> tuple[Help, ...]:
    """Return what each change brings over the best layout.

    Parameters
    ----------
    base : Score
        The best layout as it is.
    tried : sequence of (Change, Score)
        Scores of the changed layouts, from trials with the same draws. A change that could not be
        scheduled is left out.
    """
    return tuple(
        Help(change.words, score.success, score.success - base.success, score.hours - base.hours)
        for change, score in tried
        if score.trials > 0
    )
