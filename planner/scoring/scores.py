"""Outcomes of trials turned into scores."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from planner.model.trial import Prospect, Score, TrialTable
from planner.scoring.intervals import wilson
from planner.scoring.placing import place_in
from planner.scoring.rounds import Raced
from planner.scoring.sequence import final_bounds
from planner.scoring.trials import COSTS

__all__ = ["raced_scores", "score_of"]

NOT_NEEDED = "not tried: the recommendation was settled without"


def _short_of_time(prospect: Prospect, costs: Mapping[str, float]) -> str:
    """Say where a layout ends early because the time granted is spent."""
    for words, feeds, epochs in (
        ("spectra", prospect.line, costs["epochs_line"]),
        ("images", prospect.continuum, costs["epochs_continuum"]),
    ):
        most = sum(n.most_visits for n in feeds)
        if epochs >= 0.99 * most:
            return f"the time granted ends after {most} {words}"
    return ""


def score_of(prospect: Prospect, table: TrialTable) -> Score:
    """Return the score of a table of one layout with a fixed number of trials.

    Intervals are Wilson's; each end is a one-sided 90 % bound. Epochs and hours are means over the
    trials.
    """
    costs = {name: float(getattr(table, name)[0].mean()) for name in COSTS}
    return _score(prospect, table, 0, costs, promise=np.nan)


def raced_scores(raced: Raced) -> list[Score]:
    """Return one score per layout of a target whose layouts raced.

    The bounds hold with 90 % confidence each, whenever the race stopped (`sequence.final_bounds`).
    Epochs and hours are means over the weather of `costs.SKIES` trials: whole visits, and the
    standard stars of each night as if this target alone called for them.
    """
    return [
        _score(
            raced.offer.prospect(layout),
            raced.table,
            i,
            {name: float(getattr(forecast, name)) for name in COSTS},
            promise=forecast.success,
            added=i >= raced.candidates,
        )
        for i, (layout, forecast) in enumerate(
            zip(raced.offer.layouts, raced.forecasts, strict=True)
        )
    ]


def _score(
    prospect: Prospect,
    table: TrialTable,
    i: int,
    costs: Mapping[str, float],
    promise: float,
    *,
    added: bool = False,
) -> Score:
    layout, trials = table.layouts[i], int(table.trials[i])
    placing = place_in(prospect, layout)
    can = placing.first.size > 0
    success = int(table.success[i].sum())
    claims = int(table.claim[i].sum())
    if table.most:
        (lo, hi), (false_lo, false_hi) = (
            final_bounds(hits, trials, table.most) for hits in (success, claims - success)
        )
    else:
        (lo, hi), (false_lo, false_hi) = (
            wilson(hits, trials) for hits in (success, claims - success)
        )
    note = placing.note or _short_of_time(prospect, costs)
    if can and not trials:
        note = note or NOT_NEEDED
    return Score(
        target=table.target,
        layout=layout,
        promise=promise,
        success=success / trials if trials else np.nan,
        success_lo=float(lo) if can else 0.0,
        success_hi=float(hi) if can else 0.0,
        claims=claims / trials if trials else np.nan,
        false_claims=(claims - success) / trials if trials else np.nan,
        false_claims_lo=float(false_lo) if can else 0.0,
        false_claims_hi=float(false_hi) if can else 0.0,
        trials=trials if can else 0,
        note=note,
        added=added,
        **costs,
    )
