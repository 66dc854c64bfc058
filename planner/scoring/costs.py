"""What a layout costs: visits and hours, averaged over the weather."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.trial import Prospect
from planner.scoring.draws import Setting, sky_of_trial
from planner.scoring.placing import place_in
from planner.scoring.trials import COSTS, hours_of, nights_used

__all__ = ["SKIES", "costs_of"]

SKIES = 100
"""Weather draws that a mean is taken over: those of the first trials."""


def costs_of(
    setting: Setting, prospect: Prospect, layouts: Sequence[Layout], skies: int = SKIES
) -> dict[str, NDArray[np.float64]]:
    """Return mean epochs and hours of each layout, (layouts,), by name; see `trials.COSTS`.

    Hours are whole visits, and the standard stars of each night as if this target alone called for
    them; a target has the telescopes to itself. 0 where a layout cannot be scheduled.
    """
    costs = {name: np.zeros(len(layouts)) for name in COSTS}
    placings = [place_in(prospect, layout) for layout in layouts]
    for trial in range(skies):
        usable = sky_of_trial(setting, trial)
        for i, (layout, placing) in enumerate(zip(layouts, placings, strict=True)):
            if placing.first.size:
                used = nights_used(prospect, layout, placing, usable)
                for name, value in hours_of(prospect, used).items():
                    costs[name][i] += value / skies
    return costs
