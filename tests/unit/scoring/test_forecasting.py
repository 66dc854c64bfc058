from dataclasses import replace

import numpy as np
import pytest

from planner.model.campaign import Layout
from planner.scoring import setting_of
from planner.scoring.forecasting import forecast_layout, forecast_layouts, forecast_target
from planner.scoring.trials import COSTS, Task, run_trials

LAYOUTS = (Layout(3, 1, 120, 1), Layout(6, 1, 60, 1), Layout(12, 2, 90, 1))


@pytest.fixture
def setting(campaign):
    return setting_of(campaign)


def test_a_forecast_does_not_depend_on_the_layouts_beside_it(setting, prospect):
    together = forecast_target(setting, prospect, LAYOUTS[1:], 2)
    assert together == [forecast_layout(setting, prospect, one, 2) for one in LAYOUTS[1:]]
    assert together[::-1] == forecast_target(setting, prospect, LAYOUTS[:0:-1], 2)
    assert len({f.success for f in together}) > 1


def test_costs_are_those_of_the_trials(setting, prospect):
    found = forecast_target(setting, prospect, LAYOUTS, draws=4)
    trials = run_trials(Task(setting, prospect, LAYOUTS, None, 0, 4, (-np.inf,) * 3))
    assert found[0].hours > found[1].hours > 0.0
    for name in COSTS:
        costs = [getattr(f, name) for f in found]
        np.testing.assert_allclose(costs, trials[name].mean(axis=1), rtol=1e-12)


def test_what_cannot_be_scheduled_promises_and_costs_nothing(setting, prospect):
    found = forecast_layout(setting, prospect, Layout(3, 1, 60, 9))
    assert (found.success, found.error, found.hours, found.epochs_line) == (0.0, np.inf, 0.0, 0.0)


def test_too_few_epochs_promise_nothing_but_cost_their_hours(setting, prospect):
    found = forecast_layout(setting, prospect, Layout(30, 1, 60, 1))
    assert (found.success, found.error) == (0.0, np.inf)
    assert 0.0 < found.epochs_line < 5.0
    assert found.hours > 0.0


@pytest.mark.slow
def test_layouts_are_ranked_by_target_whatever_the_workers(setting, prospect):
    other = replace(prospect, forecast=replace(prospect.forecast, name="Another"))
    told = []
    alone, shared = (
        forecast_layouts(
            setting, [prospect, other], LAYOUTS, workers=workers,
            progress=lambda *step: told.append(step),
        )
        for workers in (1, 2)
    )  # fmt: skip
    assert alone == shared
    assert [f.target for f in alone] == [prospect.forecast.name] * 3 + ["Another"] * 3
    assert alone[0].success >= alone[1].success >= alone[2].success
    assert told[-1] == ("forecast", 6, 6)
