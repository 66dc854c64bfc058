"""One trial in full, to be looked at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from planner.model.campaign import Layout
from planner.model.trial import Prospect, TrialTable
from planner.recovery import LagPosterior, LagResult
from planner.scoring.draws import Setting, draw_trial
from planner.scoring.placing import place_in
from planner.scoring.recovering import (
    REASONS,
    Curves,
    by_correlation,
    by_likelihood,
    enough,
)
from planner.scoring.trials import nights_used, observe

__all__ = ["Example", "example_of"]


@dataclass(frozen=True, slots=True)
class Example:
    """One simulated campaign of one target."""

    trial: int
    lag_true_d: float
    curves: Curves
    result: LagResult | None
    """By the correlation; None: too few epochs."""
    posterior: LagPosterior | None
    """By the likelihood; None: too few epochs."""
    verdict: str
    """``success``, or why not."""


def example_of(setting: Setting, prospect: Prospect, layout: Layout, table: TrialTable) -> Example:
    """Return the first trial that came out the way most trials of the layout did."""
    at = table.layouts.index(layout)
    outcomes = table.reason[at, : table.trials[at]]
    commonest = np.bincount(outcomes).argmax()
    trial = int(np.flatnonzero(outcomes == commonest)[0])
    placing = place_in(prospect, layout)
    draw = draw_trial(setting, prospect, trial)
    curves = observe(prospect, draw, nights_used(prospect, layout, placing, draw.usable))
    span = float(placing.last[-1] - placing.first[0])
    result = posterior = None
    if enough(curves):
        result = by_correlation(setting, prospect, curves, span, str(layout), trial)
        posterior = by_likelihood(setting, prospect, curves, span)
    verdict = REASONS[commonest] or "success"
    return Example(trial, draw.lag_obs_d, curves, result, posterior, verdict)
