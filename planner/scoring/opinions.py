"""Recommended layouts tried in other ways than the one that chose them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from planner.model.campaign import Layout
from planner.model.plan import Opinion
from planner.model.trial import Prospect, Score
from planner.scoring.draws import Setting
from planner.scoring.fixed import Job, score_jobs
from planner.scoring.intervals import wilson
from planner.scoring.run import Tools
from planner.scoring.scores import score_of

__all__ = ["opinions_of"]

OTHER_TRIALS = 30
"""Trials of the correlation where the likelihood judges layouts."""

UNRELATED = "unrelated line"


def opinions_of(
    setting: Setting,
    chosen: Sequence[tuple[Prospect, Layout, float, float]],
    trials: int,
    tools: Tools,
) -> tuple[Opinion, ...]:
    """Try each recommended layout by the other method, on unrelated lines and when disturbed.

    The likelihood takes a hundred times as long as a forecast of its success, so that where the
    correlation judges layouts, the forecast stands in for it.

    Parameters
    ----------
    setting : Setting
    chosen : sequence of (Prospect, Layout, float, float)
        With the information forecast's success, and the correlation that claims must exceed: an
        observer finds it without knowing of a disturbance.
    trials : int
    tools : Tools
    """
    ways = {
        UNRELATED: (replace(setting, unrelated=True), trials),
        **{
            name: (replace(setting, disturbance=name), trials) for name in setting.success.robust_to
        },
    }
    simulation = setting.simulation
    by_forecast = simulation.method == "correlation"
    if not by_forecast:
        other = replace(setting, simulation=replace(simulation, method="correlation"))
        ways["correlation"] = (other, min(OTHER_TRIALS, trials))
    asked = [
        (Job(way, prospect, layout, count, limit=limit if by_forecast else None), what)
        for prospect, layout, _, limit in chosen
        for what, (way, count) in ways.items()
    ]
    tables = score_jobs([job for job, _ in asked], tools, "second opinions")
    tried = [
        _opinion(score_of(job.prospect, table), what)
        for (job, what), table in zip(asked, tables, strict=True)
    ]
    if by_forecast:
        tried += [_forecast(prospect, promise) for prospect, _, promise, _ in chosen]
    return tuple(tried)


def _opinion(score: Score, what: str) -> Opinion:
    false = what == UNRELATED
    claims = score.claims if false else score.false_claims
    _, most = wilson(np.array(round(claims * score.trials)), score.trials)
    return Opinion(
        target=score.target,
        what=what,
        success=0.0 if false else score.success,
        success_lo=0.0 if false else score.success_lo,
        success_hi=0.0 if false else score.success_hi,
        false_claims=claims,
        false_claims_hi=float(most),
        trials=score.trials,
    )


def _forecast(prospect: Prospect, promise: float) -> Opinion:
    nan = float("nan")
    return Opinion(prospect.forecast.name, "likelihood", promise, nan, nan, nan, nan, trials=0)
