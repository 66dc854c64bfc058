import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.scoring.race import CONFIRM, Race, next_round
from planner.scoring.sequence import final_bounds

GOAL = 0.8


def race_of(hours, *, most=400, promise=None, can=None):
    hours = np.asarray(hours, dtype=float)
    return Race(
        hours=hours,
        promise=np.full(hours.size, GOAL) if promise is None else np.asarray(promise, float),
        can=np.ones(hours.size, bool) if can is None else np.asarray(can, bool),
        goal=GOAL,
        first=10,
        most=most,
    )


def run(race, outcomes):
    """Run a race on outcomes drawn beforehand; return trials and success."""
    trials = np.zeros(race.hours.size, dtype=np.int64)
    for _ in range(200):
        known = np.arange(outcomes.shape[1]) < trials[:, None]
        after = next_round(race, trials, outcomes & known)
        assert (after >= trials).all()
        assert (after <= race.most).all()
        if (after == trials).all():
            return trials, outcomes & known
        trials = after
    raise AssertionError("the race goes on for ever")


def drawn(shares, most, seed=1):
    u = np.random.default_rng(seed).random(most)
    return u < np.asarray(shares)[:, None]


def advised(race, trials, success):
    lo, _ = final_bounds(success.sum(axis=1), trials, race.most)
    good = lo >= race.goal
    return int(np.argmin(np.where(good, race.hours, np.inf))) if good.any() else None


def test_trials_go_to_layouts_that_are_cheaper_than_one_that_reaches():
    race = race_of([10, 20, 30, 40])
    trials, success = run(race, drawn([0.2, 0.97, 0.98, 0.99], 400))
    assert advised(race, trials, success) == 1
    assert trials[0] <= 20
    assert trials[2:].sum() <= 20
    assert trials[1] >= CONFIRM


def test_a_layout_that_is_clearly_below_the_goal_drops_out_early():
    trials, _ = run(race_of([10, 20]), drawn([0.1, 0.95], 400))
    assert trials[0] == 10


def test_where_nothing_reaches_the_best_is_found_on_shared_draws():
    race = race_of([10, 20, 30])
    trials, success = run(race, drawn([0.3, 0.6, 0.4], 400))
    assert advised(race, trials, success) is None
    lo, _ = final_bounds(success.sum(axis=1), trials, race.most)
    assert np.argmax(lo) == 1
    assert trials.sum() < 400


def test_a_hopeless_target_ends_as_soon_as_that_is_shown():
    trials, _ = run(race_of([10, 20, 30]), drawn([0.0, 0.0, 0.0], 400))
    assert trials.max() <= 50


def test_what_cannot_be_scheduled_gets_no_trials():
    trials, _ = run(race_of([10, 20], can=[False, True]), drawn([0.9, 0.9], 400))
    assert trials[0] == 0
    trials, _ = run(race_of([10, 20], can=[False, False]), drawn([0.9, 0.9], 400))
    assert trials.sum() == 0


def test_the_forecast_guides_but_proves_nothing():
    race = race_of([10, 20], promise=[1.0, 1.0])
    trials, success = run(race, drawn([0.1, 0.2], 400))
    assert advised(race, trials, success) is None


def test_a_layout_whose_forecast_is_below_the_goal_gets_no_trials_where_others_reach():
    race = race_of([10, 20], promise=[GOAL - 0.2, 1.0])
    trials, success = run(race, drawn([0.5, 0.95], 400))
    assert trials[0] == 0
    assert advised(race, trials, success) == 1


def test_without_a_promising_forecast_the_best_is_still_looked_for():
    race = race_of([10, 20, 30], promise=[0.1, 0.35, 0.5])
    trials, success = run(race, drawn([0.05, 0.2, 0.4], 400))
    assert trials[0] == 0  # too far behind the best forecast
    lo, _ = final_bounds(success.sum(axis=1), trials, race.most)
    assert np.argmax(lo) == 2


def test_few_trials_allowed_are_kept_to():
    trials, _ = run(race_of([10, 20], most=7), drawn([0.8, 0.8], 7))
    assert trials.max() == 7


@settings(max_examples=60, deadline=None)
@given(
    st.lists(st.tuples(st.floats(0, 1), st.floats(1, 99)), min_size=1, max_size=8),
    st.integers(1, 150),
    st.integers(0, 10**6),
)
def test_every_race_ends_and_is_settled(layouts, most, seed):
    shares, hours = zip(*layouts, strict=True)
    race = race_of(hours, most=most)
    outcomes = np.random.default_rng(seed).random((len(shares), most)) < np.array(shares)[:, None]
    trials, success = run(race, outcomes)
    best = advised(race, trials, success)
    if best is not None:
        lo, hi = final_bounds(success.sum(axis=1), trials, most)
        cheaper = race.hours < race.hours[best]
        open_still = (trials < most) & (hi >= GOAL) & (lo < GOAL)
        assert not (cheaper & open_still).any()


@pytest.mark.slow
@pytest.mark.statistical
def test_wrong_recommendations_are_rare():
    # Eight layouts, half of them just short of the goal: the hardest case for a rule that looks
    # again and again. Each is wrongly taken with at most 10 % chance; together it is far less than
    # the sum, for their outcomes are drawn alike.
    shares = np.array([0.5, 0.7, 0.75, 0.78, 0.79, 0.86, 0.9, 0.95])
    wrong, missed = 0, 0
    for seed in range(100):
        race = race_of(np.arange(8) + 1.0, most=300)
        trials, success = run(race, drawn(shares, 300, seed))
        best = advised(race, trials, success)
        wrong += best is not None and shares[best] < GOAL
        missed += best is None
    assert wrong / 100 < 0.1
    assert missed / 100 < 0.05
