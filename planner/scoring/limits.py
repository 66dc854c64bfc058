"""What unrelated lines reach by chance, and so what a claim must exceed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from planner.model.campaign import Layout
from planner.model.trial import Prospect
from planner.scoring.draws import Setting
from planner.scoring.run import Row, Tools, outcomes
from planner.scoring.trials import run_strangers

__all__ = ["limits_of"]

TRIALS, PART = 100, 20
"""Trials whose unrelated lines set a limit, and how many are drawn at a time."""


def limits_of(cases: Sequence[tuple[Setting, Prospect, Layout]], tools: Tools) -> list[float]:
    """Return, for each case, the correlation that unrelated lines seldom exceed.

    Minus infinity where the rule does not ask for it, or the method has odds of its own. The limit
    stands one standard error of its own above the quantile asked for, as it is found from a finite
    number of lines.
    """
    asked = [
        i
        for i, (setting, _, _) in enumerate(cases)
        if setting.success.false_alarm_below < 1.0 and setting.simulation.method == "correlation"
    ]
    firsts = range(0, TRIALS, PART)
    related = {id(setting): replace(setting, unrelated=False) for setting, _, _ in cases}
    rows = [
        Row(related[id(setting)], prospect, layout, first, first + PART)
        for setting, prospect, layout in (cases[i] for i in asked)
        for first in firsts
    ]
    parts = outcomes(run_strangers, rows, tools, "unrelated lines")
    limits = [-np.inf] * len(cases)
    for number, i in enumerate(asked):
        mine = parts[number * len(firsts) : (number + 1) * len(firsts)]
        reached = np.concatenate([part["r_unrelated"].ravel() for part in mine])
        share = cases[i][0].success.false_alarm_below
        error = (share * (1.0 - share) / reached.size) ** 0.5
        quantile = 1.0 - max(share - error, 0.0)
        limits[i] = float(np.quantile(np.nan_to_num(reached, nan=-1.0), quantile))
    return limits
