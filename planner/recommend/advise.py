"""A recommendation for every target, with what limits it and what would help."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from planner.model.campaign import Campaign
from planner.model.plan import Cause, Help, Recommendation, SiteSky
from planner.model.target import Forecast
from planner.model.trial import Prospect, Score
from planner.recommend.causes import causes_of, mended
from planner.recommend.choose import choose, hopeless, recommend
from planner.recommend.helps import Change, changes_for, help_of, most_worth
from planner.scoring import (
    Job,
    Raced,
    Tools,
    observe_sky,
    prospect_of,
    raced_scores,
    score_jobs,
    score_of,
    setting_of,
)

__all__ = ["advise", "advise_without_help"]

HELP_TRIALS = (20, 60)
"""Trials of all changes, then of the better half."""


@dataclass(frozen=True, slots=True)
class _Case:
    """One target with a layout to advise."""

    index: int
    best: Score
    reached: bool
    prospect: Prospect
    raced: Raced


def advise(
    campaign: Campaign,
    forecasts: Sequence[Forecast],
    skies: Mapping[str, SiteSky],
    raced: Sequence[Raced],
    tools: Tools,
) -> tuple[Recommendation, ...]:
    """Return a recommendation for each target, in order.

    Where the goal is missed, but not hopelessly, changes to the best layout are tried. Of every
    layout advised it is found out what its failed trials fail for want of.
    """
    scores = [raced_scores(r) for r in raced]
    cases = []
    for index, (race, mine) in enumerate(zip(raced, scores, strict=True)):
        best, reached = choose(mine, campaign.success)
        if best is not None:
            cases.append(_Case(index, best, reached, race.offer.prospect(best.layout), race))
    causes = _causes(campaign, cases, tools)
    missed = [c for c in cases if not c.reached and not hopeless(c.best, campaign.success)]
    helps = _helps(campaign, forecasts, skies, missed, tools)
    return tuple(
        recommend(
            target.name,
            scores[i],
            raced[i].table,
            campaign.success,
            helps.get(i, ()),
            causes.get(i, ()),
        )
        for i, target in enumerate(campaign.targets)
    )


def advise_without_help(campaign: Campaign, raced: Sequence[Raced]) -> tuple[Recommendation, ...]:
    """Return a recommendation for each target, in order, from the races alone."""
    return tuple(
        recommend(target.name, raced_scores(race), race.table, campaign.success)
        for target, race in zip(campaign.targets, raced, strict=True)
    )


def _causes(
    campaign: Campaign, cases: Sequence[_Case], tools: Tools
) -> dict[int, tuple[Cause, ...]]:
    setting = setting_of(campaign)
    jobs = [
        (c, mended(setting, c.prospect, c.best.layout, c.raced.limit(c.best.layout))) for c in cases
    ]
    tables = iter(
        score_jobs([job for _, mine in jobs for job in mine.values()], tools, "what limits")
    )
    return {
        c.index: causes_of(
            setting, c.prospect, c.best.layout, c.raced.table, {name: next(tables) for name in mine}
        )
        for c, mine in jobs
    }


def _helps(
    campaign: Campaign,
    forecasts: Sequence[Forecast],
    skies: Mapping[str, SiteSky],
    cases: Sequence[_Case],
    tools: Tools,
) -> dict[int, list[Help]]:
    """Try changes; the half with most gain per hour again, with more trials."""
    by_last = {campaign.last_night: skies}
    tried: list[tuple[_Case, Change, Prospect]] = []
    for case in cases:
        for change in changes_for(campaign, case.best, case.prospect):
            last = change.campaign.last_night
            if last not in by_last:
                by_last[last] = observe_sky(change.campaign)
            prospect = prospect_of(
                change.campaign, case.index, forecasts[case.index], by_last[last]
            )
            tried.append((case, change, prospect))
    found: dict[int, list[Help]] = {}
    for first, most in zip((True, False), HELP_TRIALS, strict=True):
        # At first the limit of the layout without the change will do; what remains has its own.
        trials = min(most, campaign.simulation.trials)
        jobs = [
            Job(
                setting_of(change.campaign),
                prospect,
                change.layout,
                trials,
                limit=case.raced.limit(case.best.layout) if first else None,
            )
            for case, change, prospect in tried
        ]
        tables = score_jobs(jobs, tools, "what helps")
        now: dict[int, list[tuple[Help, tuple[_Case, Change, Prospect]]]] = {}
        for (case, change, prospect), table in zip(tried, tables, strict=True):
            score = score_of(prospect, table)
            if score.trials:
                gain = help_of(change, case.best, case.raced.table, score, table)
                now.setdefault(case.index, []).append((gain, (case, change, prospect)))
        tried = []
        for index, mine in now.items():
            order = most_worth([gain for gain, _ in mine])
            better = order[: (len(order) + 1) // 2]
            tried += [mine[i][1] for i in better]
            replaced = {mine[i][0].change for i in order}
            others = [h for h in found.get(index, []) if h.change not in replaced]
            both = [mine[i][0] for i in order] + others
            found[index] = [both[i] for i in most_worth(both)]
    return found
