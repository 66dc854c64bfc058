"""All layouts of all targets judged before any trial: what they promise and what they cost."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from planner.model.trial import Offer
from planner.scoring.costs import costs_of
from planner.scoring.draws import Setting
from planner.scoring.forecasting import LayoutForecast, forecast_target
from planner.scoring.run import Arrays, Row, Tools, outcomes
from planner.scoring.trials import Task

__all__ = ["forecast_offers", "run_forecasts"]


def run_forecasts(task: Task) -> Arrays:
    """Return forecast and costs of each layout of a task, (layouts,) by the names of the fields."""
    found = forecast_target(task.setting, task.prospect, task.layouts)
    return {
        "success": np.array([f.success for f in found]),
        "error": np.array([f.error for f in found]),
        **costs_of(task.setting, task.prospect, task.layouts),
    }


def forecast_offers(
    setting: Setting, offers: Sequence[Offer], tools: Tools
) -> list[list[LayoutForecast]]:
    """Return the forecast of every layout of every target, in the order of the layouts."""
    rows = [
        Row(setting, offer.prospect(layout), layout, 0, 0)
        for offer in offers
        for layout in offer.layouts
    ]
    done = iter(outcomes(run_forecasts, rows, tools, "forecast"))
    return [
        [
            LayoutForecast(
                offer.target, layout, **{name: float(v) for name, v in next(done).items()}
            )
            for layout in offer.layouts
        ]
        for offer in offers
    ]
