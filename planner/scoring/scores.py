"""Outcomes of trials turned into scores."""

from __future__ import annotations

import numpy as np

from planner.model.trial import Prospect, Score, TrialTable
from planner.scoring.intervals import wilson
from planner.scoring.placing import place_in

__all__ = ["scores_of"]


def _short_of_time(prospect: Prospect, table: TrialTable, layout: int) -> str:
    """Say where a layout ends early because the time granted is spent."""
    for kind, feeds, epochs in (
        ("spectra", prospect.line, table.epochs_line),
        ("images", prospect.continuum, table.epochs_continuum),
    ):
        most = sum(n.most_visits for n in feeds)
        if np.median(epochs[layout]) >= most:
            return f"the time granted ends after {most} {kind}"
    return ""


def scores_of(prospect: Prospect, table: TrialTable) -> list[Score]:
    """Return one score per layout of one target.

    Intervals are Wilson's; each end is a one-sided 90 % bound. Hours are clock hours of both
    streams, averaged over the trials' weather: whole visits, and the standard stars of each night
    as if this target alone called for them.
    """
    trials = table.claim.shape[1]
    success = table.success.sum(axis=1)
    false = (table.claim & ~table.success).sum(axis=1)
    lo, hi = wilson(success, trials)
    false_lo, false_hi = wilson(false, trials)
    scores = []
    for i, layout in enumerate(table.layouts):
        placing = place_in(prospect, layout)
        tried = placing.first.size > 0
        scores.append(
            Score(
                target=table.target,
                layout=layout,
                epochs_line=float(np.mean(table.epochs_line[i])),
                epochs_continuum=float(np.mean(table.epochs_continuum[i])),
                success=success[i] / trials,
                success_lo=float(lo[i]) if tried else 0.0,
                success_hi=float(hi[i]) if tried else 0.0,
                claims=float(np.mean(table.claim[i])),
                false_claims=false[i] / trials,
                false_claims_lo=float(false_lo[i]) if tried else 0.0,
                false_claims_hi=float(false_hi[i]) if tried else 0.0,
                hours=float(np.mean(table.hours[i])),
                hours_line=float(np.mean(table.hours_line[i])),
                hours_shutter=float(np.mean(table.hours_shutter[i])),
                trials=trials if tried else 0,
                note=placing.note or _short_of_time(prospect, table, i),
            )
        )
    return scores
