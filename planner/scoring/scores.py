"""Outcomes of trials turned into scores."""

from __future__ import annotations

import numpy as np

from planner.model.trial import Prospect, Score, TrialTable
from planner.scoring.intervals import wilson
from planner.scoring.placing import place

__all__ = ["scores_of"]


def scores_of(prospect: Prospect, table: TrialTable) -> list[Score]:
    """Return one score per layout of one target.

    Intervals are Wilson's; each end is a one-sided 90 % bound. Hours are clock hours: exposure,
    read-out and slews of both streams, averaged over the trials' weather.
    """
    trials = table.claim.shape[1]
    success = table.success.sum(axis=1)
    false = (table.claim & ~table.success).sum(axis=1)
    lo, hi = wilson(success, trials)
    false_lo, false_hi = wilson(false, trials)
    scores = []
    for i, layout in enumerate(table.layouts):
        placing = place(layout, prospect.seasons, prospect.line)
        epochs_line = float(np.mean(table.epochs_line[i]))
        epochs_continuum = float(np.mean(table.epochs_continuum[i]))
        hours_line = epochs_line * prospect.line.visit_s / 3600
        hours = hours_line + epochs_continuum * prospect.continuum.visit_s / 3600
        tried = placing.first.size > 0
        scores.append(
            Score(
                target=table.target,
                layout=layout,
                epochs_line=epochs_line,
                epochs_continuum=epochs_continuum,
                success=success[i] / trials,
                success_lo=float(lo[i]) if tried else 0.0,
                success_hi=float(hi[i]) if tried else 0.0,
                claims=float(np.mean(table.claim[i])),
                false_claims=false[i] / trials,
                false_claims_lo=float(false_lo[i]) if tried else 0.0,
                false_claims_hi=float(false_hi[i]) if tried else 0.0,
                hours=hours,
                hours_line=hours_line,
                trials=trials if tried else 0,
                note=placing.note,
            )
        )
    return scores
