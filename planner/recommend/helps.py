"""What would help where no layout reaches the goal: changes, tried with the same draws."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from planner.model.campaign import Campaign, Layout
from planner.model.observatory import Feed, KnownCase, Stream
from planner.model.plan import Help
from planner.model.trial import FeedNights, Prospect, Score, TrialTable

__all__ = ["Change", "changes_for", "help_of", "most_worth"]

YEAR_D = 365
DEEPER = 4.0
BETTER_CALIBRATED = 0.5
Z_90 = 1.2815515655446004
"""Normal quantile of 0.9: each end of an interval holds with 90 % confidence."""


@dataclass(frozen=True, slots=True)
class Change:
    """One change to a campaign and layout, described in words."""

    words: str
    campaign: Campaign
    layout: Layout


def changes_for(campaign: Campaign, best: Score, prospect: Prospect) -> tuple[Change, ...]:
    """Return the changes worth trying on the best layout of a target that misses the goal.

    Twice as many visits in either stream (not beyond one a night), exposures four times as long in
    either stream, a season half as long again, one season more (the campaign a year longer),
    calibration errors halved, and images where the continuum comes from spectra alone.
    """
    return (
        *_more_visits(campaign, best.layout),
        *_longer(campaign, best.layout),
        *_deeper_visits(campaign, best.layout, prospect),
        _calibrated(campaign, best.layout),
        *_images(campaign, best.layout),
    )


def _more_visits(campaign: Campaign, layout: Layout) -> list[Change]:
    changes = []
    denser = max(1.0, layout.cadence_line_nights / 2)
    if denser < layout.cadence_line_nights:
        both = replace(
            layout,
            cadence_line_nights=denser,
            cadence_continuum_nights=min(layout.cadence_continuum_nights, denser),
        )
        changes.append(Change(f"spectra every {_nights(denser)}", campaign, both))
    denser = max(1.0, layout.cadence_continuum_nights / 2)
    if campaign.continuum.feeds and denser < layout.cadence_continuum_nights:
        images = replace(layout, cadence_continuum_nights=denser)
        changes.append(Change(f"imaging every {_nights(denser)}", campaign, images))
    return changes


def _longer(campaign: Campaign, layout: Layout) -> list[Change]:
    longer, more = 1.5 * layout.season_length_d, layout.seasons + 1
    return [
        Change(f"seasons of {longer:.0f} d", campaign, replace(layout, season_length_d=longer)),
        Change(
            f"{more} seasons, the campaign a year longer",
            replace(campaign, last_night=campaign.last_night + YEAR_D),
            replace(layout, seasons=more),
        ),
    ]


def _deeper_visits(campaign: Campaign, layout: Layout, prospect: Prospect) -> list[Change]:
    """Deepen from the exposures that the layout has, so that it needs no factors of its own."""
    plain = replace(layout, exposure_line=1.0, exposure_continuum=1.0)
    line = _scaled(campaign.line, prospect.line, 1.0)
    continuum = _scaled(campaign.continuum, prospect.continuum, 1.0)
    changes = [
        Change(
            f"spectra {_of(prospect.line)}",
            replace(campaign, line=_scaled(line, prospect.line, DEEPER), continuum=continuum),
            plain,
        )
    ]
    if continuum.feeds:
        deeper = _scaled(continuum, prospect.continuum, DEEPER)
        changes.append(
            Change(
                f"images {_of(prospect.continuum)}",
                replace(campaign, line=line, continuum=deeper),
                plain,
            )
        )
    return changes


def _scaled(stream: Stream, nights: Sequence[FeedNights], factor: float) -> Stream:
    """Return a stream with exposures so many times as long as the target's now."""
    feeds = tuple(
        replace(feed, exposure_s=now.exposure_s * factor)
        for feed, now in zip(stream.feeds, nights, strict=False)  # spectra have no visits to deepen
    )
    return replace(stream, feeds=feeds)


def _of(nights: Sequence[FeedNights]) -> str:
    exposure = nights[0].exposure_s * DEEPER
    return f"of {exposure / 60:.3g} min" if exposure >= 60 else f"of {exposure:.3g} s"


def _calibrated(campaign: Campaign, layout: Layout) -> Change:
    def better(stream: Stream) -> Stream:
        feeds = tuple(replace(f, floor=f.floor * BETTER_CALIBRATED) for f in stream.feeds)
        return replace(stream, feeds=feeds)

    line, continuum = better(campaign.line), better(campaign.continuum)
    words = "calibration to half the error in both streams"
    return Change(words, replace(campaign, line=line, continuum=continuum), layout)


def _images(campaign: Campaign, layout: Layout) -> list[Change]:
    """Add images with the line's telescope where there are none.

    A usual case: signal-to-noise 100 at V = 16 in 5 min on 0.5 m, growing with the mirror, and 1 %
    calibration (common practice, no source).
    """
    if campaign.continuum.feeds:
        return []
    main = campaign.line.feeds[0]
    aperture = campaign.telescope(main.telescope).aperture_m
    camera = Feed(
        telescope=main.telescope,
        instrument=KnownCase(100.0 * aperture / 0.5, "V", 16.0, 300.0, 1.2, None, 0.0),
        floor=0.01,
        exposure_s=300.0,
        wanted_error=0.0,
        longest_s=0.0,
        exposures=1,
        read_out_s=30.0,
        overhead_s=0.0,
        standards_s=0.0,
        moon_illumination_max=1.0,
    )
    stream = replace(campaign.continuum, feeds=(camera,), in_spectra=False)
    words = f"imaging support: V images of 5 min on {main.telescope}, as often as spectra"
    return [Change(words, replace(campaign, continuum=stream), layout)]


def _nights(cadence: float) -> str:
    return "night" if cadence == 1 else f"{cadence:g} nights"


def help_of(
    change: Change, base: Score, before: TrialTable, tried: Score, after: TrialTable
) -> Help:
    """Return what a change brings over the best layout, trial by trial.

    The interval is that of Bonett & Price (2012, J. Educ. Behav. Stat. 37, 479, from memory) for
    the difference of two shares in pairs; each end holds with 90 % confidence.

    Parameters
    ----------
    change : Change
    base, tried : Score
        Of the best layout and of the changed one.
    before, after : TrialTable
        Their trials; the shorter run counts.
    """
    at = before.layouts.index(base.layout)
    shared = int(min(before.trials[at], after.trials[0]))
    was, now = before.success[at, :shared], after.success[0, :shared]
    won, lost = ((np.count_nonzero(a) + 1) / (shared + 2) for a in (now & ~was, was & ~now))
    half = Z_90 * np.sqrt((won + lost - (won - lost) ** 2) / (shared + 2))
    return Help(
        change=change.words,
        success=float(now.mean()),
        gain=float(now.mean() - was.mean()),
        gain_lo=float(won - lost - half),
        gain_hi=float(won - lost + half),
        hours=tried.hours - base.hours,
        trials=shared,
    )


def most_worth(helps: Sequence[Help]) -> list[int]:
    """Return the order of changes: the largest gain per added hour first.

    What costs less than an hour counts as an hour, so that cheap changes of no effect do not lead.
    """
    return sorted(range(len(helps)), key=lambda i: (-helps[i].per_hour, helps[i].hours))
