from dataclasses import replace

import numpy as np
import pytest

from planner.base.workers import Workers
from planner.model.campaign import Layout
from planner.model.trial import Offer
from planner.scoring import Store, Tools, forecast_offers, setting_of
from planner.scoring.forecasting import forecast_layout, forecast_target
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
def test_forecasts_are_the_same_whatever_the_workers_and_are_kept(setting, prospect, tmp_path):
    other = replace(prospect, forecast=replace(prospect.forecast, name="Another"))
    offers = [Offer(LAYOUTS, (((1.0, 1.0), p),)) for p in (prospect, other)]
    told, store = [], Store(tmp_path / "kept")
    found = []
    for count, kept in ((1, Store(None)), (2, store), (1, store)):
        told.clear()
        with Workers(count) as workers:
            tools = Tools(workers, kept, lambda *step: told.append(step[:3]))
            found.append(forecast_offers(setting, offers, tools))
    assert found[0] == found[1] == found[2]
    assert told == [("forecast", 6, 6)]
    assert [[f.layout for f in mine] for mine in found[0]] == [list(LAYOUTS)] * 2
