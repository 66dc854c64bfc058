"""A race of layouts against the whole grid: ``python bench_race.py [TARGETS [TRIALS [FILE]]]``.

Every layout of each invented target is given all the trials; then the race is run on the same
outcomes (a trial has the same outcome whenever it is made), so that the two can be compared in any
number of ways. Prints, for several goals and budgets, how many times fewer trials the race took and
how often it recommends something else than the whole grid with all trials. FILE keeps the outcomes;
50 targets and 2000 trials take two hours on two cores, `race_against_grid.txt` has what came out.
"""

import sys
import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np
from invented import write_campaign

from planner import pipeline
from planner.base.workers import Workers
from planner.scoring import Job, Store, Tools, forecast_offers, observe_sky, score_jobs, setting_of
from planner.scoring.intervals import wilson
from planner.scoring.race import HOPELESS, Race, next_round
from planner.scoring.sequence import final_bounds

WORKERS = 2
NEAR = 0.03
"""Layouts whose success differs by less are equally good advice."""


def outcomes(targets, trials, kept):
    """Return success (targets, layouts, trials), hours and forecasts (targets, layouts)."""
    with tempfile.TemporaryDirectory() as folder:
        campaign = pipeline.read(write_campaign(Path(folder) / "c.yaml", targets)).campaign
    setting = setting_of(replace(campaign, simulation=replace(campaign.simulation, trials=trials)))
    expected = pipeline.forecast_targets(campaign)
    offers = pipeline.offers_of(campaign, expected, observe_sky(campaign))
    with Workers(WORKERS) as workers:
        tools = Tools(workers, Store(kept), lambda what, n, of: print(what, n, of, end="\r"))
        forecasts = forecast_offers(setting, offers, tools)
        jobs = [
            Job(setting, offer.prospect(layout), layout, trials)
            for offer in offers
            for layout in offer.layouts
        ]
        tables = score_jobs(jobs, tools, "trials")
    success = np.array([t.success[0] for t in tables]).reshape(targets, -1, trials)
    hours = np.array([[f.hours for f in mine] for mine in forecasts])
    return success, hours, np.array([[f.success for f in mine] for mine in forecasts])


def by_grid(success, hours, goal):
    """Return decision and layout of the whole grid with a fixed number of trials."""
    hits, trials = success.sum(axis=1), success.shape[1]
    lo, hi = wilson(hits, trials)
    return chosen(lo, hi, hits / trials, hours, goal)


def by_race(success, hours, promise, goal, most):
    """Return decision and layout of the race, and the trials it took."""
    trials = np.zeros(len(hours), dtype=np.int64)
    race = Race(hours, promise, np.ones(len(hours), bool), goal, min(10, most), most)
    while True:
        known = success & (np.arange(success.shape[1]) < trials[:, None])
        after = next_round(race, trials, known)
        if (after == trials).all():
            break
        trials = after
    hits = known.sum(axis=1)
    lo, hi = final_bounds(hits, trials, most)
    lo[trials == 0] = -1.0
    return (*chosen(lo, hi, hits / np.maximum(trials, 1), hours, goal), int(trials.sum()))


def chosen(lo, hi, share, hours, goal):
    """Return decision and layout by the rule of `planner.recommend.choose`."""
    if (lo >= goal).any():
        return "observe", int(np.argmin(np.where(lo >= goal, hours, np.inf)))
    best = int(np.lexsort((hours, -share, -lo))[0])
    return ("leave out" if hi[best] < HOPELESS * goal else "risky"), best


def compare(success, hours, promise):
    """Print the table."""
    targets, layouts, all_trials = success.shape
    print(f"{targets} targets, {layouts} layouts, reference {all_trials} trials of each layout")
    print(
        "goal  budget  fewer  other advice  of it beyond 0.03  below the goal  grid: other advice"
    )
    for goal in (0.3, 0.5, 0.8):
        for most in [m for m in (100, 400, 2000) if m <= all_trials]:
            taken = other = beyond = below = grid_other = 0
            for s, h, p in zip(success, hours, promise, strict=True):
                truth = s.mean(axis=1)
                why, best = by_grid(s, h, goal)
                so, found, trials = by_race(s, h, p, goal, most)
                same = found == best or why == so == "leave out"
                taken += trials
                other += not same
                beyond += not same and abs(truth[found] - truth[best]) >= NEAR
                below += so == "observe" and truth[found] < goal
                so, found = by_grid(s[:, :most], h, goal)
                grid_other += not (found == best or why == so == "leave out")
            fewer = targets * layouts * most / taken
            print(
                f"{goal:4.1f} {most:7d} {fewer:5.1f}x {other:13d} {beyond:18d} {below:15d} "
                f"{grid_other:19d}"
            )


if __name__ == "__main__":
    numbers = [int(word) for word in sys.argv[1:3]]
    targets, trials = [*numbers, *(8, 200)[len(numbers) :]]
    compare(*outcomes(targets, trials, Path(sys.argv[3]) if len(sys.argv) > 3 else None))
