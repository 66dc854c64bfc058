"""The whole flow, from a campaign file to a plan.

::

    campaign file -> targets' forecast -> nights & seasons -> layouts -> trials -> scores
        -> recommendation -> night-by-night schedule -> scores of the real schedule -> report
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager, suppress
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

from planner.agn import forecast, relation_names
from planner.base.errors import InputError, PlanError
from planner.base.provenance import file_hashes, planner_version, versions
from planner.base.timescale import UT1_NOTE
from planner.base.workers import Workers
from planner.campaign import Reading, read_campaign
from planner.model.campaign import Campaign, Layout
from planner.model.plan import Plan, Recommendation, SiteSky
from planner.model.target import Forecast
from planner.model.trial import Offer, Prospect, Score
from planner.recommend import advise, hardened, lists_of, sensitivities_of
from planner.schedule import (
    Request,
    assign,
    hours_by_target,
    planned,
    requests_of,
    time_spent,
    used_nights,
)
from planner.scoring import (
    Job,
    Raced,
    Store,
    Tools,
    Used,
    observe_sky,
    offer_of,
    opinions_of,
    prospect_of,
    race_targets,
    raced_scores,
    score_jobs,
    score_of,
    setting_of,
    sky_of_trial,
    with_spectra,
)

__all__ = [
    "dark_hours",
    "forecast_targets",
    "make_plan",
    "observe_sky",
    "offers_of",
    "prospects_of",
    "race_all",
    "read",
    "tools_with",
]

TRIALS_AFTER = 100
"""Trials of what is tried with the recommended layouts alone, at most."""


def read(path: Path, seed: int | None = None) -> Reading:
    """Read a campaign file; `seed` replaces the file's. Raises `InputError`."""
    reading = read_campaign(path, relation_names())
    if seed is None:
        return reading
    return replace(reading, campaign=replace(reading.campaign, seed=seed))


@contextmanager
def tools_with(workers: int = 1, cluster: str | None = None) -> Iterator[Tools]:
    """Give tools that keep nothing and say nothing."""
    with Workers(workers, cluster) as processes:
        yield Tools(processes, Store(None), lambda *_: None)


def forecast_targets(campaign: Campaign) -> tuple[Forecast, ...]:
    """Return what each target is expected to do."""
    return tuple(
        forecast(
            target,
            band=continuum_band(campaign),
            relations=dict(campaign.relations),
            cosmology=campaign.cosmology,
            error_below=campaign.success.error_below,
        )
        for target in campaign.targets
    )


def other_forecasts(campaign: Campaign, index: int) -> list[Forecast]:
    """Return what the other relations of a target's line expect; none where the lag is given."""
    target = campaign.targets[index]
    alone = replace(campaign, targets=(target,))
    (expected,) = forecast_targets(alone)
    found: list[Forecast] = []
    for key in relation_names().get(expected.line, ()):
        if target.lag_rest_d is None and key != expected.relation:
            # One relation needs the target's iron strength.
            with suppress(InputError):
                found += forecast_targets(replace(alone, relations=((expected.line, key),)))
    return found


def continuum_band(campaign: Campaign) -> str:
    """Return the band whose mix of AGN and host the continuum has; V where spectra give it."""
    feeds = campaign.continuum.feeds
    return getattr(feeds[0].instrument, "band", "V") if feeds else "V"


def offers_of(
    campaign: Campaign, forecasts: Sequence[Forecast], skies: dict[str, SiteSky]
) -> tuple[Offer, ...]:
    """Return each target's layouts and what they can use; `forecasts` in the targets' order."""
    return tuple(
        offer_of(campaign, index, expected, skies) for index, expected in enumerate(forecasts)
    )


def prospects_of(
    campaign: Campaign, forecasts: Sequence[Forecast], skies: dict[str, SiteSky]
) -> tuple[Prospect, ...]:
    """Return each target with exposures as they stand; `forecasts` in the targets' order."""
    return tuple(
        prospect_of(campaign, index, expected, skies) for index, expected in enumerate(forecasts)
    )


def race_all(campaign: Campaign, offers: Sequence[Offer], tools: Tools) -> list[Raced]:
    """Run trials until it is settled which layout to recommend for each target."""
    return race_targets(setting_of(campaign), offers, tools)


def make_plan(reading: Reading, tools: Tools) -> Plan:
    """Do the main job.

    Parameters
    ----------
    reading : Reading
        From `read`.
    tools : Tools
        Workers, the store of finished work, progress; the results do not depend on them.

    Raises
    ------
    PlanError
        If no target can be observed at all.
    """
    campaign = reading.campaign
    forecasts = forecast_targets(campaign)
    skies = observe_sky(campaign)
    offers = offers_of(campaign, forecasts, skies)
    if not any(offer.plain.seasons for offer in offers):
        raise PlanError(no_window(campaign))
    raced = race_all(campaign, offers, tools)
    advice = advise(campaign, forecasts, skies, raced, tools)
    prospects = tuple(_prospect(r, a) for r, a in zip(raced, advice, strict=True))
    setting = setting_of(campaign)
    trials = min(TRIALS_AFTER, campaign.simulation.trials)
    opinions = opinions_of(
        setting,
        [
            (p, a.score.layout, a.score.promise, r.limit(a.score.layout))
            for p, a, r in zip(prospects, advice, raced, strict=True)
            if a.score
        ],
        trials,
        tools,
    )
    advice = tuple(hardened(a, opinions, campaign.success) for a in advice)
    chosen = _scheduled(prospects, advice)
    requests = requests_of(campaign, chosen)
    visits, unplaced = planned(campaign, requests)
    limits = {
        r.offer.target: r.limit(a.score.layout)
        for r, a in zip(raced, advice, strict=True)
        if a.score
    }
    return Plan(
        campaign=campaign,
        forecasts=forecasts,
        skies=skies,
        prospects=prospects,
        trials=tuple(r.table for r in raced),
        scores=tuple(s for r in raced for s in raced_scores(r)),
        recommendations=advice,
        opinions=opinions,
        sensitivities={
            a.target: sensitivities_of(
                setting, other_forecasts(campaign, i), prospects[i], a.score.layout, raced[i].table
            )
            for i, a in enumerate(advice)
            if a.scheduled and a.score
        },
        subsets=lists_of(
            campaign, raced, [a.score if a.scheduled else None for a in advice], hours=None
        ),
        visits=tuple(visits),
        unplaced=tuple(unplaced),
        time_spent=time_spent(campaign, visits, dark_hours(skies)),
        hours_scheduled=hours_by_target(campaign, visits),
        executed=execute(campaign, chosen, limits, requests, trials, tools),
        run=run_record(reading),
    )


def _prospect(raced: Raced, advice: Recommendation) -> Prospect:
    """Return the target as its recommended layout sees it."""
    if advice.score is None:
        return raced.offer.plain
    return raced.offer.prospect(advice.score.layout)


def _scheduled(
    prospects: Sequence[Prospect], advice: Sequence[Recommendation]
) -> list[tuple[Prospect, Layout]]:
    """Return the targets that take part in the schedule, each with its layout."""
    return [
        (prospect, a.score.layout)
        for prospect, a in zip(prospects, advice, strict=True)
        if a.scheduled and a.score is not None
    ]


def execute(
    campaign: Campaign,
    chosen: Sequence[tuple[Prospect, Layout]],
    limits: dict[str, float],
    requests: Sequence[Request],
    trials: int,
    tools: Tools,
) -> dict[str, Score]:
    """Run the schedule of all targets under each trial's weather and score what is left of it.

    `limits` are, by target, the correlations that claims must exceed.
    """
    setting = setting_of(campaign)
    used: dict[str, list[Used]] = {prospect.forecast.name: [] for prospect, _ in chosen}
    for trial in range(trials):
        visits = assign(campaign, requests, sky_of_trial(setting, trial))
        nights = dict(
            zip(
                ((r.target, r.stream, r.feed) for r in requests),
                used_nights(requests, visits),
                strict=True,
            )
        )
        for prospect, _ in chosen:
            name = prospect.forecast.name
            imaging, line = (
                tuple(nights[name, stream.kind, i] for i in range(len(stream.feeds)))
                for stream in (campaign.continuum, campaign.line)
            )
            used[name].append(with_spectra(prospect, imaging, line))
        tools.progress("weather over the schedule", trial + 1, trials)
    jobs = [
        Job(
            setting,
            prospect,
            layout,
            trials,
            tuple(used[prospect.forecast.name]),
            limits[prospect.forecast.name],
        )
        for prospect, layout in chosen
    ]
    tables = score_jobs(jobs, tools, "schedule under weather")
    return {
        job.prospect.forecast.name: score_of(job.prospect, table)
        for job, table in zip(jobs, tables, strict=True)
    }


def dark_hours(skies: dict[str, SiteSky]) -> dict[str, float]:
    """Return, by site, the mean dark hours of the campaign's nights; none count as 0."""
    means = {}
    for site, sky in skies.items():
        hours = (sky.nights.dark_end_mjd - sky.nights.dark_start_mjd) * 24
        means[site] = float(np.nan_to_num(hours).mean())
    return means


def no_window(campaign: Campaign) -> str:
    """Say that nothing can be observed, and what would change that."""
    limits = campaign.limits
    return (
        f"{campaign.name}: no target has a night on which a whole visit fits within airmass "
        f"{limits.airmass:g}, sun below {limits.sun_altitude_deg:g} deg, moon farther than "
        f"{limits.moon_separation_deg:g} deg and the telescopes' time; check coordinates and site, "
        "widen the limits, shorten the exposures or move the dates"
    )


def run_record(reading: Reading) -> dict[str, Any]:
    """Return the provenance of a run: enough to repeat it."""
    return {
        "planner": planner_version(),
        "campaign": reading.campaign.name,
        "seed": reading.campaign.seed,
        "files": file_hashes(reading.files),
        "versions": versions(),
        "time_note": UT1_NOTE,
    }
