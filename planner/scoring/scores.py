"""Outcomes of trials turned into scores."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

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
    (counts,) = _counts(table)
    return _score(prospect, table, 0, counts, costs, promise=np.nan)


def raced_scores(raced: Raced) -> list[Score]:
    """Return one score per layout of a target whose layouts raced.

    The bounds hold with 90 % confidence each, whenever the race stopped (`sequence.final_bounds`).
    Epochs and hours are means over the weather of `costs.SKIES` trials: whole visits, and the
    standard stars of each night as if this target alone called for them.
    """
    counts = _counts(raced.table)
    return [
        _score(
            raced.offer.prospect(layout),
            raced.table,
            i,
            counts[i],
            {name: float(getattr(forecast, name)) for name in COSTS},
            promise=forecast.success,
            added=i >= raced.candidates,
        )
        for i, (layout, forecast) in enumerate(
            zip(raced.offer.layouts, raced.forecasts, strict=True)
        )
    ]


class _Counts(NamedTuple):
    """Shares of one layout's trials, each with its bounds."""

    success: float
    success_lo: float
    success_hi: float
    false: float
    false_lo: float
    false_hi: float


def _counts(table: TrialTable) -> list[_Counts]:
    """Return the shares of right and of wrong claims of every layout; NaN without trials."""
    columns = []
    for hits in (table.success.sum(axis=1), (table.claim & ~table.success).sum(axis=1)):
        lo, hi = (
            final_bounds(hits, table.trials, table.most)
            if table.most
            else wilson(hits, table.trials)
        )
        columns += [np.where(table.trials > 0, hits / np.maximum(table.trials, 1), np.nan), lo, hi]
    return [_Counts(*(float(value) for value in row)) for row in zip(*columns, strict=True)]


def _score(
    prospect: Prospect,
    table: TrialTable,
    i: int,
    counts: _Counts,
    costs: Mapping[str, float],
    promise: float,
    *,
    added: bool = False,
) -> Score:
    layout, trials = table.layouts[i], int(table.trials[i])
    placing = place_in(prospect, layout)
    can = placing.first.size > 0
    note = placing.note or _short_of_time(prospect, costs)
    if can and not trials:
        note = note or NOT_NEEDED
    return Score(
        target=table.target,
        layout=layout,
        promise=promise,
        success=counts.success,
        success_lo=counts.success_lo if can else 0.0,
        success_hi=counts.success_hi if can else 0.0,
        claims=counts.success + counts.false,
        false_claims=counts.false,
        false_claims_lo=counts.false_lo if can else 0.0,
        false_claims_hi=counts.false_hi if can else 0.0,
        trials=trials if can else 0,
        note=note,
        added=added,
        **costs,
    )
