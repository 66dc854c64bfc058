"""Trials: the rooms below joined into simulated campaigns, and what these say of a layout.

In: a campaign, forecasts, windows. Out: outcomes of trials and scores with confidence intervals.
A trial draws lag, variability, response width, weather and noise; the same draws serve every
layout of a target. Layouts race: trials go where they settle the recommendation. Finished work is
kept in a store, so that an interrupted run goes on.
"""

from planner.scoring.candidates import deepened, layouts_of, offer_of
from planner.scoring.depth import Depth, depth_of
from planner.scoring.draws import Setting, normals_of, setting_of, sky_of_trial
from planner.scoring.example import Example, example_of
from planner.scoring.fixed import Job, score_jobs
from planner.scoring.forecasting import LayoutForecast, ambiguity_of, forecast_layout
from planner.scoring.intervals import wilson
from planner.scoring.opinions import opinions_of
from planner.scoring.own import STRANGERS, OwnRecovery, recover_own
from planner.scoring.placing import Placing, by_year, place, place_in
from planner.scoring.prospects import prospect_of
from planner.scoring.race import HOPELESS
from planner.scoring.recovering import REASONS, Curves
from planner.scoring.rounds import Raced, race_targets
from planner.scoring.run import Progress, Tools
from planner.scoring.scores import raced_scores, score_of
from planner.scoring.screening import forecast_offers
from planner.scoring.sensitivity import reweighted, sensitivities
from planner.scoring.store import Store, key_of
from planner.scoring.trials import Used, with_spectra
from planner.scoring.visibility import observe_sky

__all__ = [
    "HOPELESS",
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
    "Raced",
    "Setting",
    "Store",
    "Tools",
    "Used",
    "ambiguity_of",
    "by_year",
    "deepened",
    "depth_of",
    "example_of",
    "forecast_layout",
    "forecast_offers",
    "key_of",
    "layouts_of",
    "normals_of",
    "observe_sky",
    "offer_of",
    "opinions_of",
    "place",
    "place_in",
    "prospect_of",
    "race_targets",
    "raced_scores",
    "recover_own",
    "reweighted",
    "score_jobs",
    "score_of",
    "sensitivities",
    "setting_of",
    "sky_of_trial",
    "wilson",
    "with_spectra",
]
