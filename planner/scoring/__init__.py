"""Trials: the rooms below joined into simulated campaigns, and what these say of a layout.

In: a campaign, forecasts, windows. Out: outcomes of trials and scores with confidence intervals.
A trial draws lag, variability, response width, weather and noise; the same draws serve every
layout of a target. Finished work is kept in a store, so that an interrupted run goes on.
"""

from planner.scoring.example import Example, example_of
from planner.scoring.intervals import wilson
from planner.scoring.placing import Placing, place
from planner.scoring.prospects import prospect_of
from planner.scoring.run import Job, Progress, Used, score_targets
from planner.scoring.scores import scores_of
from planner.scoring.store import Store, key_of
from planner.scoring.trials import REASONS, Setting, setting_of, sky_of_trial

__all__ = [
    "REASONS",
    "Example",
    "Job",
    "Placing",
    "Progress",
    "Setting",
    "Store",
    "Used",
    "example_of",
    "key_of",
    "place",
    "prospect_of",
    "score_targets",
    "scores_of",
    "setting_of",
    "sky_of_trial",
    "wilson",
]
