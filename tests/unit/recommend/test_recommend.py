from dataclasses import replace

import numpy as np
import pytest

from planner.model.campaign import Layout, SuccessRule
from planner.model.plan import Help, Opinion
from planner.model.trial import Score, TrialTable
from planner.recommend import choose, hardened, recommend
from planner.recommend.helps import changes_for, help_of, most_worth

RULE = SuccessRule(0.8, 0.3, 0.3, 0.5, 1.0)
LAYOUTS = tuple(Layout(c, 1.0, length, 1) for c in (3.0, 6.0) for length in (60.0, 120.0))


def score(layout, success, hours, trials=100, note=""):
    half = 0.06 if trials else 0.0
    return Score(
        "One", layout, 0.9, 20.0, 60.0, success, success - half,
        success + half, success, 0.05, 0.0, 0.1, hours, hours / 2, hours / 3, trials, note,
    )  # fmt: skip


def table(reasons):
    shape = (len(LAYOUTS), len(reasons))
    nan = np.full(shape, np.nan)
    reason = np.tile(np.array(reasons, dtype=np.int8), (len(LAYOUTS), 1))
    return TrialTable(
        "One", LAYOUTS, np.full(len(LAYOUTS), len(reasons)), 0, nan, nan, nan, nan, nan,
        np.zeros(shape, int), np.zeros(shape, int),
        nan, nan, nan,
        reason == 0, reason == 0, reason,
    )  # fmt: skip


def scores(*pairs, **options):
    return [score(la, s, h, **options) for la, (s, h) in zip(LAYOUTS, pairs, strict=True)]


def test_the_cheapest_layout_that_surely_reaches_the_goal_is_advised():
    best, reached = choose(scores((0.5, 10), (0.87, 30), (0.95, 40), (0.99, 90)), RULE)
    assert reached
    assert best.hours == 30


def test_a_layout_that_reaches_the_goal_by_chance_alone_is_not_enough():
    best, reached = choose(scores((0.5, 10), (0.84, 30), (0.95, 40), (0.99, 90)), RULE)
    assert reached
    assert best.hours == 40


def test_without_any_the_best_is_advised_and_the_cheaper_of_equals():
    best, reached = choose(scores((0.5, 10), (0.6, 50), (0.6, 30), (0.2, 5)), RULE)
    assert not reached
    assert best.hours == 30


def test_layouts_that_could_not_be_tried_are_never_advised():
    rows = scores((0.0, 0), (0.0, 0), (0.0, 0), (0.0, 0), trials=0, note="never up")
    assert choose(rows, RULE) == (None, False)
    advice = recommend("One", rows, table([1]), RULE)
    assert (advice.decision, advice.score, advice.why) == ("leave out", None, "never up")
    assert not advice.scheduled


def test_the_reason_names_what_trials_fail_of_and_what_helps_most():
    rows = scores((0.5, 10), (0.6, 50), (0.6, 30), (0.2, 5))
    helps = (
        Help("images of 20 min", 0.66, 0.06, 0.02, 0.1, 3.0, 60),
        Help("seasons of 90 d", 0.75, 0.15, 0.1, 0.2, 9.0, 60),
        Help("spectra every night", 0.95, 0.35, -0.1, 0.7, 90.0, 60),
    )
    advice = recommend("One", rows, table([0, 5, 5, 4, 5, 0, 0, 0, 0, 7]), RULE, helps)
    assert advice.decision == "risky"
    assert advice.why == (
        "no layout reaches the goal of 80%; this is the best; trials fail mostly of: "
        "error too large (30%), weak correlation (10%); what would help most for the time: images "
        "of 20 min (success 66%, +3 h), and whatever the time: seasons of 90 d (75%, +9 h)"
    )


def test_too_few_trials_are_said_and_not_taken_for_failure():
    rows = scores((0.5, 10), (0.6, 50), (0.82, 30), (0.2, 5), trials=20)
    advice = recommend("One", rows, table([0] * 20), RULE)
    assert advice.decision == "risky"
    assert advice.why.startswith(
        "no layout is shown to reach the goal of 80%: 20 trials leave 76% to 88%; more trials"
    )
    assert "fail of" not in advice.why


def test_a_hopeless_target_is_left_out_of_the_schedule():
    advice = recommend("One", scores(*[(0.02, 10)] * 4), table([4] * 10), RULE)
    assert advice.decision == "leave out"
    assert "weak correlation (100%)" in advice.why


def test_reasons_do_not_boast_of_changes_that_bring_nothing():
    helps = (
        Help("images of 20 min", 0.55, 0.05, -0.01, 0.11, 3.0, 20),
        Help("seasons of 90 d", 0.4, -0.1, -0.2, 0.0, 9.0, 20),
    )
    advice = recommend("One", scores(*[(0.5, 10)] * 4), table([4] * 10), RULE, helps)
    assert advice.why.endswith("none of the changes tried is shown to help")


def test_a_disturbance_that_breaks_the_goal_makes_a_target_risky():
    rule = replace(RULE, robust_to=("outliers",))
    advice = recommend(
        "One", scores((0.5, 10), (0.9, 30), (0.95, 40), (0.99, 90)), table([0]), rule
    )
    broken = Opinion("One", "outliers", 0.6, 0.5, 0.7, 0.1, 0.2, 100)
    assert hardened(advice, [broken], rule).decision == "risky"
    assert hardened(advice, [broken], rule).why.endswith("but not robust to outliers (60%)")
    for harmless in (
        replace(broken, success_lo=0.85),
        replace(broken, target="Two"),
        replace(broken, what="likelihood"),
    ):
        assert hardened(advice, [harmless], rule) == advice


def test_changes_differ_from_the_best_layout_in_one_thing_each(campaign, prospect):
    best = score(Layout(6.0, 2.0, 60.0, 1), 0.5, 10)
    campaign = replace(campaign, continuum=replace(campaign.continuum, cadence_nights=(2.0,)))
    changes = {c.words: c for c in changes_for(campaign, best, prospect)}
    assert list(changes) == [
        "spectra every 3 nights",
        "imaging every night",
        "seasons of 90 d",
        "2 seasons, the campaign a year longer",
        "spectra of 80 min",
        "images of 20 min",
        "calibration to half the error in both streams",
    ]
    longer = changes["2 seasons, the campaign a year longer"]
    assert longer.campaign.last_night - campaign.last_night == 365
    assert changes["spectra of 80 min"].campaign.line.feeds[0].exposure_s == 4800


def test_found_exposures_are_made_longer_than_the_targets_own(campaign, prospect):
    (feed,) = campaign.line.feeds
    auto = replace(feed, exposure_s=None, wanted_error=0.03, longest_s=3600.0)
    campaign = replace(campaign, line=replace(campaign.line, feeds=(auto,)))
    changes = changes_for(campaign, score(Layout(6.0, 1.0, 60.0, 1), 0.5, 10), prospect)
    (deeper,) = [c for c in changes if c.words == "spectra of 80 min"]
    assert deeper.campaign.line.feeds[0].exposure_s == 4 * prospect.line[0].exposure_s


def test_nobody_is_told_to_observe_more_often_than_nightly(campaign, prospect):
    changes = changes_for(campaign, score(Layout(1.0, 1.0, 60.0, 1), 0.5, 10), prospect)
    assert not any("every" in c.words for c in changes)


def test_where_the_continuum_comes_from_spectra_images_are_proposed(campaign, prospect):
    alone = replace(campaign, continuum=replace(campaign.continuum, feeds=(), in_spectra=True))
    changes = changes_for(alone, score(Layout(6.0, 6.0, 60.0, 1), 0.5, 10), prospect)
    (images,) = [c for c in changes if c.words.startswith("imaging support")]
    (feed,) = images.campaign.continuum.feeds
    assert feed.telescope == campaign.line.feeds[0].telescope
    assert not images.campaign.continuum.in_spectra
    assert not any(c.words.startswith("images of") for c in changes)


def outcomes(success, layouts=LAYOUTS[:1]):
    whole = table([0] * len(success))
    success = np.tile(np.array(success, dtype=bool), (len(layouts), 1))
    return replace(whole, layouts=layouts, trials=np.full(len(layouts), success.shape[1]),
                   success=success)  # fmt: skip


def test_gains_are_paired_differences_from_the_best_layout(campaign, prospect):
    base, tried = score(LAYOUTS[0], 0.5, 10), score(LAYOUTS[0], 0.7, 25)
    change = changes_for(campaign, base, prospect)[0]
    was, now = [1, 0] * 20, [1, 0, 1, 1] * 10
    found = help_of(change, base, outcomes(was), tried, outcomes(now))
    assert (found.gain, found.hours, found.trials) == (pytest.approx(0.25), 15, 40)
    assert 0 < found.gain_lo < 0.25 < found.gain_hi
    # The same trials in another order are not the same pairs: the interval is wider.
    shuffled = help_of(change, base, outcomes(was[1:] + was[:1]), tried, outcomes(now))
    assert shuffled.gain == pytest.approx(0.25)
    assert shuffled.gain_lo < found.gain_lo
    # The shorter run counts.
    assert help_of(change, base, outcomes(was), tried, outcomes(now[:20])).trials == 20


def test_most_worth_is_the_gain_for_an_hour():
    cheap = Help("cheap", 0.6, 0.1, 0.0, 0.2, 5.0, 60)
    strong = Help("strong", 0.9, 0.4, 0.3, 0.5, 40.0, 60)
    free = Help("free", 0.55, 0.05, 0.0, 0.1, 0.0, 60)
    useless = Help("useless", 0.5, 0.0, -0.1, 0.1, 0.0, 60)
    assert most_worth([useless, strong, cheap, free]) == [3, 2, 1, 0]
