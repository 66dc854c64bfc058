import numpy as np
import pytest

from planner.compare import Scenario, compare_scenarios
from planner.model.campaign import Layout
from planner.model.plan import Recommendation
from planner.model.trial import Score, TrialTable

LAYOUT = Layout(3.0, 1.0, 60.0, 1)


def scenario(name, success, claim=None, decision="observe"):
    success = np.atleast_2d(np.asarray(success, dtype=bool))
    claim = success if claim is None else np.atleast_2d(np.asarray(claim, dtype=bool))
    nan = np.full(success.shape, np.nan)
    count = np.zeros(success.shape, dtype=int)
    table = TrialTable(
        "One",
        (LAYOUT,),
        np.array([success.shape[1]]),
        0,
        nan,
        nan,
        nan,
        nan,
        nan,
        count,
        count,
        nan,
        nan,
        nan,
        claim,
        success,
        count,
    )
    share = float(success.mean())
    score = Score(
        "One", LAYOUT, 0.9, 9, 9, share, share, share, share, 0, 0, 0, 12.5, 6, 4, success.size, ""
    )
    return Scenario(name, (table,), (Recommendation("One", decision, score, "", ()),))


def test_yield_and_paired_gain():
    first = [1, 0, 1, 0] * 25
    second = [1, 1, 1, 0] * 25
    a, b = compare_scenarios([scenario("a", first), scenario("b", second)])
    assert (a.lags, b.lags) == (0.5, 0.75)
    assert (a.gain, b.gain) == (0.0, 0.25)
    assert b.hours == 12.5
    # paired: the difference is 0 or 1, so its error is that of one share, not of two
    half = 1.645 * np.std(np.array(second) - first, ddof=1) / 10
    assert b.gain_hi - b.gain == pytest.approx(half, rel=1e-3)
    assert b.told_apart


def test_equal_scenarios_cannot_be_told_apart():
    success = np.random.default_rng(0).random(50) < 0.5
    _, b = compare_scenarios([scenario("a", success), scenario("b", success)])
    assert (b.gain, b.told_apart) == (0.0, False)


def test_wrong_claims_are_counted_and_targets_left_out_are_not():
    a, b = compare_scenarios(
        [
            scenario("a", [0, 0, 1, 1], [1, 0, 1, 1]),
            scenario("b", [1, 1, 1, 1], decision="leave out"),
        ]
    )
    assert a.wrong_claims == 0.25
    assert (b.lags, b.hours) == (0.0, 0.0)


@pytest.mark.statistical
def test_the_interval_of_a_difference_holds_the_truth_in_nine_of_ten_cases():
    rng = np.random.default_rng(5)
    held = 0
    for _ in range(400):
        shared = rng.random(200)
        _, b = compare_scenarios(
            [scenario("a", shared < 0.5), scenario("b", (shared + rng.normal(0, 0.1, 200)) < 0.6)]
        )
        held += b.gain_lo <= 0.09995 <= b.gain_hi
    assert held / 400 == pytest.approx(0.9, abs=3 * np.sqrt(0.09 / 400))
