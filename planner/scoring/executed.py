"""Trials of a target on the nights that a schedule really gave it."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.trial import Prospect
from planner.scoring.draws import Setting, draw_trial
from planner.scoring.placing import place_in
from planner.scoring.trials import Used, empty_table, fill

__all__ = ["run_executed"]


def run_executed(
    setting: Setting, prospect: Prospect, layout: Layout, used: Sequence[Used], first: int
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
    placing = place_in(prospect, layout)
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
