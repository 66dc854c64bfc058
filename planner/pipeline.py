"""The whole flow, from a campaign file to a plan.

::

    campaign file -> targets' forecast -> nights & seasons -> layouts -> trials -> scores
        -> recommendation -> night-by-night schedule -> scores of the real schedule -> report
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

from planner.agn import forecast, relation_names
from planner.base.errors import PlanError
from planner.base.provenance import file_hashes, planner_version, versions
from planner.base.timescale import UT1_NOTE
from planner.campaign import Reading, read_campaign
from planner.model.campaign import Campaign
from planner.model.plan import Help, Plan, Recommendation, SiteSky
from planner.model.target import Forecast, Target
from planner.model.trial import Prospect, Score, TrialTable
from planner.recommend import Change, changes_for, choose, hardened, helps_of, recommend
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
    Progress,
    Store,
    Used,
    opinions_of,
    prospect_of,
    score_targets,
    scores_of,
    setting_of,
    sky_of_trial,
    with_spectra,
)
from planner.sky import nights_at, windows_of

__all__ = [
    "forecast_targets",
    "make_plan",
    "observe_sky",
    "prospects_of",
    "read",
    "recommend_all",
    "schedule_all",
    "score_all",
]


def read(path: Path, seed: int | None = None) -> Reading:
    """Read a campaign file; `seed` replaces the file's. Raises `InputError`."""
    reading = read_campaign(path, relation_names())
    if seed is None:
        return reading
    return replace(reading, campaign=replace(reading.campaign, seed=seed))


def forecast_targets(campaign: Campaign) -> tuple[Forecast, ...]:
    """Return what each target is expected to do."""
    return tuple(_forecast(campaign, target) for target in campaign.targets)


def _forecast(campaign: Campaign, target: Target) -> Forecast:
    return forecast(
        target,
        band=continuum_band(campaign),
        relations=dict(campaign.relations),
        cosmology=campaign.cosmology,
        error_below=campaign.success.error_below,
    )


def continuum_band(campaign: Campaign) -> str:
    """Return the band whose mix of AGN and host the continuum has; V where spectra give it."""
    feeds = campaign.continuum.feeds
    return getattr(feeds[0].instrument, "band", "V") if feeds else "V"


def observe_sky(campaign: Campaign) -> dict[str, SiteSky]:
    """Return the nights of each site and the windows of all targets in them."""
    ra = np.array([t.ra_deg for t in campaign.targets])
    dec = np.array([t.dec_deg for t in campaign.targets])
    limits = campaign.limits
    no_moon = replace(limits, moon_separation_deg=180.0)
    limited = {
        campaign.site(feed.telescope).name
        for stream in (campaign.line, campaign.continuum)
        for feed in stream.feeds
        if feed.moon_illumination_max < 1.0
    }
    skies = {}
    for site in campaign.sites:
        nights = nights_at(site, campaign.first_night, campaign.last_night, limits)
        dark = (ra, dec) if site.name in limited else (ra[:0], dec[:0])
        skies[site.name] = SiteSky(
            nights,
            windows_of(ra, dec, site, nights, limits),
            windows_of(*dark, site, nights, no_moon),
        )
    return skies


def prospects_of(
    campaign: Campaign, forecasts: Sequence[Forecast], skies: dict[str, SiteSky]
) -> tuple[Prospect, ...]:
    """Return each target as its trials see it; `forecasts` in the order of the targets."""
    return tuple(
        prospect_of(campaign, index, expected, skies) for index, expected in enumerate(forecasts)
    )


def score_all(
    campaign: Campaign,
    prospects: Sequence[Prospect],
    *,
    workers: int,
    store: Store,
    progress: Progress,
) -> tuple[tuple[TrialTable, ...], tuple[tuple[Score, ...], ...]]:
    """Run the trials of every layout of every target; return them and each target's scores."""
    setting, layouts = setting_of(campaign), campaign.layouts()
    tables = score_targets(
        [Job(setting, prospect, layouts) for prospect in prospects],
        workers=workers,
        store=store,
        progress=progress,
        label="trials",
    )
    scores = tuple(tuple(scores_of(p, t)) for p, t in zip(prospects, tables, strict=True))
    return tuple(tables), scores


def recommend_all(
    campaign: Campaign,
    forecasts: Sequence[Forecast],
    prospects: Sequence[Prospect],
    tables: Sequence[TrialTable],
    scores: Sequence[Sequence[Score]],
    *,
    workers: int,
    store: Store,
    progress: Progress,
) -> tuple[Recommendation, ...]:
    """Return a recommendation for each target; where the goal is missed, try what would help."""
    rule = campaign.success
    tried: list[tuple[int, Score, Change, Prospect]] = []
    for index, of_target in enumerate(scores):
        best, reached = choose(of_target, rule)
        if best is not None and not reached:
            for change in changes_for(campaign, best, prospects[index]):
                alone = replace(change.campaign, targets=(campaign.targets[index],))
                prospect = prospects_of(alone, [forecasts[index]], observe_sky(alone))[0]
                tried.append((index, best, change, prospect))
    changed = score_targets(
        [Job(setting_of(c.campaign), p, (c.layout,)) for _, _, c, p in tried],
        workers=workers,
        store=store,
        progress=progress,
        label="what would help",
    )
    helps: dict[int, list[Help]] = {}
    for (index, best, change, prospect), table in zip(tried, changed, strict=True):
        helps.setdefault(index, []).extend(
            helps_of(best, [(change, scores_of(prospect, table)[0])])
        )
    return tuple(
        recommend(t.name, scores[i], tables[i], rule, helps.get(i, ()))
        for i, t in enumerate(campaign.targets)
    )


def schedule_all(
    campaign: Campaign,
    prospects: Sequence[Prospect],
    recommendations: Sequence[Recommendation],
) -> tuple[Request, ...]:
    """Return what the targets that take part in the schedule ask of the telescopes."""
    return requests_of(
        campaign,
        [
            (prospect, advice.score.layout)
            for prospect, advice in zip(prospects, recommendations, strict=True)
            if advice.scheduled and advice.score is not None
        ],
    )


def execute(
    campaign: Campaign,
    prospects: Sequence[Prospect],
    recommendations: Sequence[Recommendation],
    requests: Sequence[Request],
    *,
    workers: int,
    store: Store,
    progress: Progress,
) -> dict[str, Score]:
    """Run the schedule of all targets under each trial's weather and score what is left of it."""
    setting = setting_of(campaign)
    kept = [
        (prospect, advice.score.layout)
        for prospect, advice in zip(prospects, recommendations, strict=True)
        if advice.scheduled and advice.score is not None
    ]
    used: dict[str, list[Used]] = {prospect.forecast.name: [] for prospect, _ in kept}
    for trial in range(setting.simulation.trials):
        visits = assign(campaign, requests, sky_of_trial(setting, trial))
        nights = dict(
            zip(
                ((r.target, r.stream, r.feed) for r in requests),
                used_nights(requests, visits),
                strict=True,
            )
        )
        for prospect, _ in kept:
            name = prospect.forecast.name
            imaging, line = (
                tuple(nights[name, stream.kind, i] for i in range(len(stream.feeds)))
                for stream in (campaign.continuum, campaign.line)
            )
            used[name].append(with_spectra(prospect, imaging, line))
        progress("weather over the schedule", trial + 1, setting.simulation.trials)
    jobs = [
        Job(setting, prospect, (layout,), tuple(used[prospect.forecast.name]))
        for prospect, layout in kept
    ]
    tables = score_targets(
        jobs, workers=workers, store=store, progress=progress, label="schedule under weather"
    )
    return {
        job.prospect.forecast.name: scores_of(job.prospect, table)[0]
        for job, table in zip(jobs, tables, strict=True)
    }


def make_plan(
    reading: Reading,
    *,
    workers: int = 1,
    store: Store | None = None,
    progress: Progress | None = None,
) -> Plan:
    """Do the main job.

    Parameters
    ----------
    reading : Reading
        From `read`.
    workers : int
        Processes; the results do not depend on it.
    store : Store, optional
        Keeps finished trials, so that an interrupted run goes on.
    progress : callable, optional

    Raises
    ------
    PlanError
        If no target can be observed at all.
    """
    campaign = reading.campaign
    store = store or Store(None)
    progress = progress or (lambda _what, _done, _all: None)
    forecasts = forecast_targets(campaign)
    skies = observe_sky(campaign)
    prospects = prospects_of(campaign, forecasts, skies)
    if not any(p.seasons for p in prospects):
        raise PlanError(no_window(campaign))
    tables, scores = score_all(campaign, prospects, workers=workers, store=store, progress=progress)
    advice = recommend_all(
        campaign,
        forecasts,
        prospects,
        tables,
        scores,
        workers=workers,
        store=store,
        progress=progress,
    )
    opinions = opinions_of(
        setting_of(campaign),
        [(p, a.score.layout) for p, a in zip(prospects, advice, strict=True) if a.score],
        workers=workers,
        store=store,
        progress=progress,
    )
    advice = tuple(hardened(a, opinions, campaign.success) for a in advice)
    requests = schedule_all(campaign, prospects, advice)
    visits, unplaced = planned(campaign, requests)
    executed = execute(
        campaign, prospects, advice, requests, workers=workers, store=store, progress=progress
    )
    return Plan(
        campaign=campaign,
        forecasts=forecasts,
        skies=skies,
        prospects=prospects,
        trials=tables,
        scores=tuple(s for of_target in scores for s in of_target),
        recommendations=advice,
        opinions=opinions,
        visits=tuple(visits),
        unplaced=tuple(unplaced),
        time_spent=time_spent(campaign, visits, dark_hours(skies)),
        hours_scheduled=hours_by_target(campaign, visits),
        executed=executed,
        run=run_record(reading),
    )


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
