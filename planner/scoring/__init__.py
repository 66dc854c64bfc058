"""Trials: the rooms below joined into simulated campaigns, and what these say of a layout.

In: a campaign, forecasts, windows. Out: outcomes of trials and scores with confidence intervals.
A trial draws lag, variability, response width, weather and noise; the same draws serve every
layout of a target. Finished work is kept in a store, so that an interrupted run goes on.
"""

from planner.scoring.depth import Depth, depth_of
from planner.scoring.draws import Setting, setting_of, sky_of_trial
from planner.scoring.example import Example, example_of
from planner.scoring.forecasting import LayoutForecast, ambiguity_of, forecast_layouts
from planner.scoring.intervals import wilson
from planner.scoring.opinions import opinions_of
from planner.scoring.own import STRANGERS, OwnRecovery, recover_own
from planner.scoring.placing import Placing, place, place_in
from planner.scoring.prospects import prospect_of
from planner.scoring.recovering import REASONS, Curves
from planner.scoring.run import Job, Progress, score_targets
from planner.scoring.scores import scores_of
from planner.scoring.store import Store, key_of
from planner.scoring.trials import Used, with_spectra

__all__ = [
    "REASONS",
    "STRANGERS",
    "Curves",
    "Depth",
    "Example",
    "Job",
    "LayoutForecast",
    "OwnRecovery",
    "Placing",
    "Progress",
    "Setting",
    "Store",
    "Used",
    "ambiguity_of",
    "depth_of",
    "example_of",
    "forecast_layouts",
    "key_of",
    "opinions_of",
    "place",
    "place_in",
    "prospect_of",
    "recover_own",
    "score_targets",
    "scores_of",
    "setting_of",
    "sky_of_trial",
    "wilson",
    "with_spectra",
]
