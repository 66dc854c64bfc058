"""Trials of a target on the nights that a schedule really gave it."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.trial import Prospect
from planner.scoring.placing import place
from planner.scoring.trials import Setting, draw_trial, empty_table, fill

__all__ = ["Used", "run_executed"]

Used = tuple[tuple[NDArray[np.bool_], NDArray[np.bool_]], ...]
"""By trial: the nights used by the continuum and by the line, over the nights on offer."""


def run_executed(
    setting: Setting, prospect: Prospect, layout: Layout, used: Used, first: int
) -> dict[str, NDArray[np.float64]]:
    """Run one trial per element of `used`, from trial number `first` on.

    The draws are those of the same trials of the layout on its own, so that the difference is what
    the other targets cost.

    Returns
    -------
    dict of (1, trials) float64 arrays
        The columns of `TrialTable`.
    """
    table = empty_table(1, len(used))
    placing = place(layout, prospect.seasons, prospect.line)
    span = float(placing.last[-1] - placing.first[0])
    for i, taken in enumerate(used):
        draw = draw_trial(setting, prospect, first + i)
        table["lag_true_d"][0, i] = draw.lag_obs_d
        fill(
            table,
            (0, i),
            setting,
            prospect,
            draw,
            taken,
            span,
            f"executed {layout}",
            first + i,
        )
    return table
