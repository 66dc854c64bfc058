import itertools
from time import perf_counter

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.special import ndtr, ndtri

from planner.base.errors import PlanError
from planner.model.campaign import Layout
from planner.recommend import subset
from planner.recommend.subset import Option, best_subset, lags_distribution, yield_curve

LAYOUT = Layout(3.0, 1.0, 120.0, 1)


def option(target, success, *costs, weight=1.0):
    return Option(target, LAYOUT, success, costs, weight)


def by_trying_all(options, budgets):
    """Every choice of at most one option per target, in the order of preference for equals."""
    names = list(dict.fromkeys(o.target for o in options))
    per_target = [
        [*(i for i, o in enumerate(options) if o.target == n and o.weight * o.success > 0), None]
        for n in names
    ]
    best, best_key = (), (0.0, 0.0)
    found = False
    for choice in itertools.product(*per_target):
        taken = [options[i] for i in choice if i is not None]
        used = [sum(o.costs[r] for o in taken) for r in range(len(budgets))]
        if any(u > b + 1e-9 for u, b in zip(used, budgets, strict=True)):
            continue
        key = (
            round(sum(o.weight * o.success for o in taken), 9),
            -round(sum(used), 9),
        )
        if not found or key > best_key:
            found, best, best_key = True, tuple(sorted(i for i in choice if i is not None)), key
    return best


# Tenths and quarters of hours: many ties, and sums that floats do not hit exactly.
costs = st.integers(0, 12).map(lambda k: k / 10)
budget = st.one_of(st.integers(0, 40).map(lambda k: k / 10), st.just(np.inf))


@st.composite
def cases(draw):
    resources = draw(st.integers(1, 3))
    options = [
        option(
            draw(st.sampled_from("ABCDE")),
            draw(st.integers(0, 10)) / 10,
            *(draw(costs) for _ in range(resources)),
            weight=draw(st.sampled_from([1.0, 1.0, 0.5, 3.0, 0.0])),
        )
        for _ in range(draw(st.integers(0, 10)))
    ]
    return options, [draw(budget) for _ in range(resources)]


@given(cases())
@settings(max_examples=200, deadline=None)
def test_the_subset_is_the_best_of_all_and_so_are_its_ties(case):
    options, budgets = case
    assert best_subset(options, budgets) == by_trying_all(options, budgets)


def table(seed, targets=200, layouts=24, resources=1):
    """Success rises with the hours spent, with scatter; hundredths, as trials give."""
    rng = np.random.default_rng(seed)
    base = rng.uniform(3, 80, targets)[:, None, None]
    hours = base * np.exp(rng.normal(0, 0.6, (targets, layouts, resources)))
    depth = np.log(hours.sum(2) / base[:, :, 0]) + rng.normal(0, 1, (targets, 1))
    success = rng.binomial(100, 1 / (1 + np.exp(-1.5 * depth))) / 100
    options = [
        option(f"T{t}", success[t, k], *hours[t, k]) for t in range(targets) for k in range(layouts)
    ]
    return options, 0.2 * hours.mean(axis=1).sum(axis=0)


def greedy(options, budgets):
    """Options by lags per share of the budgets, as far as they fit."""
    left, seen, lags = np.array(budgets, dtype=float), set(), 0.0
    for o in sorted(options, key=lambda o: -o.success / np.sum(o.costs / budgets)):
        if o.target not in seen and np.all(left >= o.costs):
            seen.add(o.target)
            left -= o.costs
            lags += o.success
    return lags


@pytest.mark.parametrize("seed", range(3))
def test_large_cases_are_never_below_greed_nor_over_budget(seed):
    options, budgets = table(seed)
    (row,) = yield_curve(options, [budgets])
    assert row.lags >= greedy(options, budgets)
    assert row.lags == pytest.approx(sum(options[i].success for i in row.chosen))
    assert row.costs[0] <= budgets[0] + 1e-4
    assert row.short == 0
    targets = [options[i].target for i in row.chosen]
    assert len(targets) == len(set(targets))


@pytest.mark.parametrize("resources", [1, 2])
def test_an_integer_programme_finds_no_more(resources):
    """Independent: HiGHS on 60 targets, all options."""
    options, budgets = table(7, targets=60, resources=resources)
    names = sorted({o.target for o in options})
    once = np.array([[o.target == n for o in options] for n in names], dtype=float)
    hours = np.array([o.costs for o in options]).T / budgets[:, None]
    solved = milp(
        [-o.success for o in options],
        integrality=np.ones(len(options)),
        bounds=Bounds(0, 1),
        constraints=[LinearConstraint(once, -np.inf, 1), LinearConstraint(hours, -np.inf, 1)],
        options={"mip_rel_gap": 0},
    )
    (row,) = yield_curve(options, [budgets])
    assert row.lags == pytest.approx(-solved.fun, abs=2e-6)
    assert row.short == 0


def test_two_hundred_targets_take_less_than_two_seconds():
    options, budgets = table(11)
    started = perf_counter()
    best_subset(options, budgets)
    assert perf_counter() - started < 2


def test_what_a_search_cut_short_may_have_missed_is_said(monkeypatch):
    options, budgets = table(5, targets=40, resources=3)
    (whole,) = yield_curve(options, [budgets])
    monkeypatch.setattr(subset, "MOST_STATES", 5)
    (cut,) = yield_curve(options, [budgets])
    assert whole.short == 0
    assert cut.short > 0
    assert cut.lags <= whole.lags <= cut.lags + cut.short
    assert all(c <= b + 1e-4 for c, b in zip(cut.costs, budgets, strict=True))


def test_more_hours_never_give_fewer_lags_and_all_the_hours_all_of_them():
    options, budgets = table(3, targets=30)
    rows = yield_curve(options, [budgets * f for f in (0.25, 0.5, 1, 2, 4, np.inf)])
    lags = [row.lags for row in rows]
    assert lags == sorted(lags)
    best = {}
    for o in options:
        best[o.target] = max(best.get(o.target, 0.0), o.success)
    assert lags[-1] == pytest.approx(sum(best.values()))
    assert lags[0] < lags[-1]


def test_the_order_of_options_of_other_targets_does_not_matter():
    options, budgets = table(9, targets=30)
    shuffled = np.random.default_rng(0).permutation(len(options))
    there = best_subset(options, budgets)
    again = best_subset([options[i] for i in shuffled], budgets)
    assert sorted(shuffled[list(again)]) == list(there)


def test_without_hours_only_what_is_free_is_taken():
    options = [option("A", 0.5, 1.0), option("B", 0.3, 0.0), option("C", 0.0, 0.0)]
    assert best_subset(options, [0.0]) == (1,)
    assert best_subset(options[:1], [0.0]) == ()
    assert best_subset([], [5.0]) == ()


def test_a_target_too_dear_on_one_telescope_is_left_out():
    options = [option("A", 0.9, 1.0, 9.0), option("A", 0.2, 1.0, 2.0), option("B", 0.4, 1.0, 1.0)]
    assert best_subset(options, [10.0, 3.0]) == (1, 2)
    assert best_subset(options, [10.0, np.inf]) == (0, 2)


def test_one_option_each_that_do_not_fit_together_are_not_taken_together():
    options = [option("A", 0.9, 2.0), option("B", 0.8, 1.0), option("C", 1.0, 2.0)]
    assert best_subset(options, [3.0]) == (1, 2)
    assert best_subset(options, [2.5]) == (2,)


def test_hours_that_just_fit_do():
    """0.1 + 0.2 is above 0.3 as floats are added."""
    assert best_subset([option("A", 0.5, 0.1), option("B", 0.5, 0.2)], [0.3]) == (0, 1)


def test_of_equals_the_cheapest_and_then_the_first_are_taken():
    same = [option(name, 0.5, 2.0) for name in "ABCD"]
    assert best_subset(same, [5.0]) == (0, 1)
    assert best_subset([*same, option("E", 0.5, 1.5)], [5.0]) == (0, 4)
    assert best_subset([option("A", 0.5, 2.0), option("A", 0.5, 2.0)], [5.0]) == (0,)
    split = [option("A", 0.5, 1.0, 3.0), option("A", 0.5, 2.0, 1.0)]
    assert best_subset(split, [5.0, np.inf]) == (1,)


def test_many_equal_targets_are_no_trouble():
    """As many ways to choose as there are subsets of 50 out of 200."""
    options = [option(f"T{t}", 0.6, 3.0, 2.0) for t in range(200)]
    assert best_subset(options, [150.0, 120.0]) == tuple(range(50))


def test_weights_turn_the_choice():
    options = [option("A", 0.9, 2.0), option("B", 0.5, 2.0, weight=2.0)]
    assert best_subset(options, [3.0]) == (1,)
    (row,) = yield_curve(options, [[3.0]])
    assert (row.lags, row.costs, row.budgets) == (1.0, (2.0,), (3.0,))


def test_tiny_and_huge_weights_are_counted_alike():
    for scale in (1e-12, 1.0, 1e12):
        options = [option("A", 0.9, 2.0, weight=scale), option("B", 0.8, 1.0, weight=scale)]
        assert best_subset(options, [2.0]) == (0,)
        assert best_subset(options, [3.0]) == (0, 1)


@pytest.mark.parametrize(
    ("bad", "budgets", "message"),
    [
        (option("A", np.nan, 1.0), [5.0], "A: success nan"),
        (option("A", 1.2, 1.0), [5.0], "not between 0 and 1"),
        (option("A", 0.5, np.inf), [5.0], "costs"),
        (option("A", 0.5, -1.0), [5.0], "costs"),
        (option("A", 0.5, 1.0, weight=np.nan), [5.0], "weight nan"),
        (option("A", 0.5, 1.0, 1.0), [5.0], "2 costs for 1 budgets"),
        (option("A", 0.5, 1.0), [-5.0], "negative or NaN"),
        (option("A", 0.5, 1.0), [np.nan], "negative or NaN"),
    ],
)
def test_numbers_that_mean_nothing_are_refused(bad, budgets, message):
    with pytest.raises(ValueError, match=message):
        best_subset([bad], budgets)


def test_an_unsolved_programme_is_said(monkeypatch):
    class Unsolved:
        status, message = 4, "numerical difficulties"

    monkeypatch.setattr(subset, "linprog", lambda *_, **__: Unsolved)
    with pytest.raises(PlanError, match="numerical difficulties"):
        best_subset([option("A", 0.5, 1.0), option("B", 0.5, 1.0)], [1.0])


# The number of lags


def outcomes(rng, success, trials, common):
    """Trials with shared weather: outcomes given the weather are independent."""
    weather = rng.normal(size=max(trials))
    rows = []
    for p, n in zip(success, trials, strict=True):
        chance = ndtr((ndtri(p) + np.sqrt(common) * weather[:n]) / np.sqrt(1 - common))
        rows.append(rng.random(n) < chance)
    return rows


def test_without_common_weather_counts_are_those_of_independent_trials():
    """One trial in each of ten blocks succeeds, in another block for each target: no covariance
    but a negative one, which counts as none."""
    rows = [np.arange(10) == t for t in range(4)]
    found = lags_distribution(rows)
    expected = [1.0]
    for _ in rows:
        expected = np.convolve(expected, [0.9, 0.1])
    assert found.probabilities == pytest.approx(expected, abs=1e-12)
    assert found.mean == pytest.approx(0.4)
    assert (found.lo10, found.median, found.hi90) == (0, 0, 1)


def test_targets_that_always_fail_together_come_all_or_none():
    row = np.arange(200) % 4 > 0
    found = lags_distribution([row] * 5)
    assert found.mean == pytest.approx(3.75)
    assert found.probabilities[5] == pytest.approx(0.75, abs=0.06)
    assert found.probabilities[0] == pytest.approx(0.25, abs=0.06)
    assert (found.lo10, found.hi90) == (0, 5)


@pytest.mark.parametrize("common", [0.1, 0.3, 0.6])
def test_the_spread_is_that_of_shared_weather(common):
    """Against the counts of 200 000 campaigns with the same weather, from 4000 trials."""
    rng = np.random.default_rng(4)
    success = rng.uniform(0.3, 0.95, 20)
    count = np.sum(outcomes(rng, success, [200_000] * 20, common), axis=0)
    found = lags_distribution(outcomes(rng, success, [4000] * 20, common))
    numbers = np.arange(21)
    mean = numbers @ found.probabilities
    spread = np.sqrt((numbers - mean) ** 2 @ found.probabilities)
    assert mean == pytest.approx(found.mean, abs=1e-3)
    assert spread == pytest.approx(count.std(), rel=0.05)
    assert spread > 1.15 * np.sqrt(np.sum(success * (1 - success)))
    for q, level in ((found.lo10, 10), (found.median, 50), (found.hi90, 90)):
        assert abs(q - np.percentile(count, level)) <= 1


def test_short_and_long_trials_are_both_used():
    """Some targets had 60 trials, others 600: the mean is of all, the spread right on average."""
    rng = np.random.default_rng(8)
    success = np.linspace(0.4, 0.9, 12)
    trials = [60, 600] * 6
    truth = np.sum(outcomes(rng, success, [100_000] * 12, 0.3), axis=0).std()
    spreads = []
    for _ in range(25):
        rows = outcomes(rng, success, trials, 0.3)
        found = lags_distribution(rows)
        assert found.mean == pytest.approx(sum(r.mean() for r in rows))
        numbers = np.arange(13)
        mean = numbers @ found.probabilities
        spreads.append(np.sqrt((numbers - mean) ** 2 @ found.probabilities))
    assert np.mean(spreads) == pytest.approx(truth, rel=0.06)
    assert np.std(spreads) < 0.2 * truth


def test_certain_targets_and_single_trials_count():
    found = lags_distribution([np.ones(50, bool), np.zeros(3, bool), np.ones(1, bool)])
    assert found.probabilities == pytest.approx([0, 0, 1, 0], abs=1e-12)
    assert (found.mean, found.lo10, found.median, found.hi90) == (2.0, 2, 2, 2)


def test_no_targets_give_no_lags_and_no_trials_no_answer():
    empty = lags_distribution([])
    assert (empty.mean, empty.hi90, empty.probabilities) == (0.0, 0, (1.0,))
    with pytest.raises(ValueError, match="without trials"):
        lags_distribution([np.ones(5, bool), np.zeros(0, bool)])
