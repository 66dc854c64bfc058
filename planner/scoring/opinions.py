"""Recommended layouts tried in other ways than the one that chose them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from planner.model.campaign import Layout
from planner.model.plan import Opinion
from planner.model.trial import Prospect
from planner.scoring.draws import Setting
from planner.scoring.intervals import wilson
from planner.scoring.run import Job, Progress, score_targets
from planner.scoring.scores import scores_of
from planner.scoring.store import Store

__all__ = ["opinions_of"]

OTHER_TRIALS = 30
"""Trials of the other recovery method: the likelihood takes ten times as long."""


def opinions_of(
    setting: Setting,
    chosen: Sequence[tuple[Prospect, Layout]],
    *,
    workers: int,
    store: Store,
    progress: Progress,
) -> tuple[Opinion, ...]:
    """Try each recommended layout by the other method, on unrelated lines and when disturbed."""
    simulation = setting.simulation
    other = "likelihood" if simulation.method == "correlation" else "correlation"
    few = min(OTHER_TRIALS, simulation.trials)
    ways = {
        other: replace(setting, simulation=replace(simulation, method=other, trials=few)),
        "unrelated line": replace(setting, unrelated=True),
        **{name: replace(setting, disturbance=name) for name in setting.success.robust_to},
    }
    asked = [
        (prospect, layout, what, way) for prospect, layout in chosen for what, way in ways.items()
    ]
    tables = score_targets(
        [Job(way, prospect, (layout,)) for prospect, layout, _, way in asked],
        workers=workers,
        store=store,
        progress=progress,
        label="second opinions",
    )
    opinions = []
    for (prospect, _, what, way), table in zip(asked, tables, strict=True):
        (score,) = scores_of(prospect, table)
        claims = score.claims if way.unrelated else score.false_claims
        _, most = wilson(np.array(round(claims * score.trials)), score.trials)
        opinions.append(
            Opinion(
                target=score.target,
                what=what,
                success=0.0 if way.unrelated else score.success,
                success_lo=0.0 if way.unrelated else score.success_lo,
                success_hi=0.0 if way.unrelated else score.success_hi,
                false_claims=claims,
                false_claims_hi=float(most),
                trials=score.trials,
            )
        )
    return tuple(opinions)
