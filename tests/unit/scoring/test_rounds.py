from collections import Counter
from dataclasses import replace

import numpy as np
import pytest

from planner import pipeline
from planner.base.workers import Workers
from planner.model.campaign import Layout
from planner.scoring import Store, Tools, observe_sky, race_targets, raced_scores, setting_of


class Counting(Workers):
    """Workers that count how often each row was worked out."""

    def __init__(self):
        super().__init__(1)
        self.rows = Counter()

    def each(self, work, tasks):
        for task in tasks:
            for layout in task.layouts:
                self.rows[work.__name__, task.prospect.forecast.name, layout, task.first] += 1
        return super().each(work, tasks)


def offers_of(campaign, seen=None):
    forecasts = pipeline.forecast_targets(campaign)
    lively = [
        replace(f, lag_obs_d=9.0, amplitude_mag=0.4, timescale_obs_d=60.0) if i == 0 else f
        for i, f in enumerate(forecasts)
    ]
    return pipeline.offers_of(campaign, seen or lively, observe_sky(campaign))


@pytest.fixture(scope="module")
def small(campaign):
    return replace(campaign, simulation=replace(campaign.simulation, trials=40, resamples=20))


def race(campaign, offers, store=None, workers=None):
    tools = Tools(workers or Workers(), store or Store(None), lambda *_: None)
    return race_targets(setting_of(campaign), offers, tools)


@pytest.mark.slow
def test_trials_are_not_the_same_for_all_and_scores_say_how_many(small):
    easy, hard = race(small, offers_of(small))
    for raced in (easy, hard):
        for score, trials in zip(raced_scores(raced), raced.table.trials, strict=True):
            assert score.trials == trials
            assert score.success_lo <= score.success_hi
            if trials == 0:
                assert np.isnan(score.success)
                assert score.note.startswith("not tried")
    total = easy.table.trials.sum() + hard.table.trials.sum()
    assert total < 40 * (len(easy.offer.layouts) + len(hard.offer.layouts))
    assert easy.table.trials.max() <= 40


@pytest.mark.slow
def test_more_trials_allowed_use_those_there_are(small, tmp_path):
    """A larger budget, another goal: no outcome is worked out twice."""
    store, workers = Store(tmp_path / "kept"), Counting()
    offers = offers_of(small)
    race(small, offers, store, workers)
    once = workers.rows.copy()
    race(small, offers, store, workers)
    assert workers.rows == once
    larger = replace(small.simulation, trials=60)
    other = replace(small, simulation=larger, success=replace(small.success, goal=0.3))
    race(other, offers, store, workers)
    assert workers.rows.total() > once.total()
    assert set(workers.rows.values()) == {1}


@pytest.mark.slow
def test_a_changed_target_is_worked_out_anew_and_no_other(small, tmp_path):
    store = Store(tmp_path / "kept")
    race(small, offers_of(small), store)
    one, two = small.targets
    changed = replace(small, targets=(one, replace(two, redshift=two.redshift * 1.1)))
    workers = Counting()
    race(changed, offers_of(changed), store, workers)
    assert "run_trials" in {work for work, *_ in workers.rows}
    assert {target for _, target, *_ in workers.rows} == {"Two"}


@pytest.mark.slow
def test_layouts_between_the_candidates_may_win(small):
    """Two candidates far apart: what lies between is cheaper and is found."""
    wide = replace(
        small,
        targets=small.targets[:1],
        season_lengths_d=(40.0, 180.0),
        line=replace(small.line, cadence_nights=(1.0, 20.0)),
        success=replace(small.success, goal=0.5, false_alarm_below=1.0),
    )
    (raced,) = race(wide, offers_of(wide))
    candidates = {Layout(c, 1.0, d, 1) for c in (1.0, 20.0) for d in (40.0, 180.0)}
    between = set(raced.offer.layouts) - candidates
    assert between
    reached = [s for s in raced_scores(raced) if s.success_lo >= 0.5]
    assert min(reached, key=lambda s: s.hours).layout in between
