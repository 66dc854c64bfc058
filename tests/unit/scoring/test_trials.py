from dataclasses import replace

import numpy as np
import pytest

from planner.base.workers import Workers
from planner.model.campaign import Layout
from planner.scoring import REASONS, Job, Store, Tools, score_jobs, score_of, setting_of
from planner.scoring.draws import draw_trial, sky_of_trial
from planner.scoring.recovering import Found, judge
from planner.scoring.trials import Task, nights_used, run_trials

LAYOUTS = (Layout(3, 1, 120, 1), Layout(6, 1, 60, 1))


@pytest.fixture
def setting(campaign):
    return setting_of(campaign)


def run(jobs, workers=1, store=None, progress=lambda *_: None):
    with Workers(workers) as processes:
        return score_jobs(jobs, Tools(processes, store or Store(None), progress), "trials")


def result(**values):
    values = {
        "lag_d": 10.0, "lag_lo_d": 9.0, "lag_hi_d": 11.0, "r_max": 0.9, "in_peak": 1.0,
    } | values  # fmt: skip
    return Found(**values)


@pytest.mark.parametrize(
    ("found", "truth", "claim", "success", "reason"),
    [
        (result(), 10.0, True, True, ""),
        (result(), 13.0, True, True, ""),
        (result(), 20.0, True, False, "claimed lag is wrong"),
        (None, 10.0, False, False, "too few epochs"),
        (result(lag_d=np.nan, lag_lo_d=np.nan, lag_hi_d=np.nan), 10.0, False, False,
         "no peak inside the search range"),
        (result(r_max=0.4), 10.0, False, False, "weak correlation"),
        (result(lag_lo_d=2.0, lag_hi_d=18.0), 10.0, False, False, "error too large"),
        (result(lag_lo_d=-1.0, lag_hi_d=10.5), 10.0, False, False, "consistent with zero lag"),
        (result(in_peak=0.4), 10.0, False, False, "several peaks"),
        (result(agrees=False), 10.0, False, False, "methods disagree"),
        (result(log_odds=2.9), 10.0, False, False, "could be chance"),
        (result(log_odds=3.1), 10.0, True, True, ""),
        (result(lag_d=-5.0, lag_lo_d=-6.0, lag_hi_d=-4.0), 10.0, False, False,
         "consistent with zero lag"),
    ],
)  # fmt: skip
def test_claims_and_successes_are_kept_apart(campaign, found, truth, claim, success, reason):
    rule = replace(campaign.success, in_peak_above=0.5, false_alarm_below=0.05)
    verdict = judge(found, truth, rule)
    assert verdict == (claim, success, REASONS.index(reason))


def test_the_same_draws_serve_every_layout(setting, prospect):
    both = run_trials(Task(setting, prospect, LAYOUTS, None, 0, 3, (-np.inf,) * 2))
    alone = run_trials(Task(setting, prospect, LAYOUTS[1:], None, 0, 3, (-np.inf,)))
    for name, column in alone.items():
        assert np.array_equal(column[0], both[name][1], equal_nan=True), name
    assert np.array_equal(both["lag_true_d"][0], both["lag_true_d"][1])


def test_targets_share_the_weather_and_nothing_else(setting, prospect):
    other = replace(prospect, forecast=replace(prospect.forecast, name="Two"))
    a, b = draw_trial(setting, prospect, 4), draw_trial(setting, other, 4)
    assert np.array_equal(a.usable["Big"], b.usable["Big"])
    assert a.lag_obs_d != b.lag_obs_d
    assert not np.array_equal(a.line[0].flux, b.line[0].flux)


def test_a_longer_campaign_starts_with_the_same_weather(setting):
    longer = replace(setting, nights=setting.nights + 365)
    short = sky_of_trial(setting, 2)["Big"]
    assert np.array_equal(sky_of_trial(longer, 2)["Big"][: short.size], short)


def test_visits_are_made_on_clear_nights_only(setting, prospect):
    draw = draw_trial(setting, prospect, 0)
    from planner.scoring import place_in

    placing = place_in(prospect, LAYOUTS[0])
    continuum, line = nights_used(prospect, LAYOUTS[0], placing, draw.usable)
    for used, on_offer in ((*continuum, *prospect.continuum), (*line, *prospect.line)):
        assert used.any()
        assert draw.usable[on_offer.telescope][on_offer.night[used]].all()


def test_drawn_lags_follow_the_forecast(setting, prospect):
    lags = np.log10([draw_trial(setting, prospect, i).lag_obs_d for i in range(400)])
    assert np.mean(lags) == pytest.approx(np.log10(12.24), abs=3 * 0.2 / 20)
    assert np.std(lags) == pytest.approx(0.2, rel=3 / np.sqrt(800))


def test_an_easy_target_succeeds_and_a_noisy_one_does_not(campaign, prospect):
    setting = replace(
        setting_of(campaign), simulation=replace(campaign.simulation, trials=20, resamples=40)
    )
    lively = replace(prospect.forecast, lag_obs_d=8.0, amplitude_mag=0.4, timescale_obs_d=60.0)
    easy = replace(prospect, forecast=lively)
    noisy = replace(easy, line=(replace(prospect.line[0], flux_error=np.full(181, 1.0)),))
    good, bad = run([Job(setting, p, LAYOUTS[0], 20) for p in (easy, noisy)])
    assert score_of(easy, good).success > 0.7
    assert score_of(noisy, bad).success < 0.3


def test_a_layout_that_cannot_be_is_said_and_not_tried(setting, prospect):
    layout = Layout(3, 1, 60, 2)
    (table,) = run([Job(setting, prospect, layout, 5)])
    score = score_of(prospect, table)
    assert score.trials == 0
    assert score.note == "the campaign holds one season of this target"
    assert (score.success, score.success_hi, score.hours) == (0, 0, 0)


def test_hours_are_visits_times_their_length(setting, prospect):
    for table in run([Job(setting, prospect, layout, 5) for layout in LAYOUTS]):
        score = score_of(prospect, table)
        hours = score.epochs_line * 0.5 + score.epochs_continuum * 420 / 3600
        assert score.hours == pytest.approx(hours)


def test_kept_results_are_used_again(tmp_path, setting, prospect):
    seen = []
    store = Store(tmp_path / "kept")
    job = Job(setting, prospect, LAYOUTS[0], 25)
    (first,) = run([job], store=store)
    (again,) = run([job], store=store, progress=lambda *a: seen.append(a[:3]))
    assert seen[-1] == ("trials", 3, 3)
    assert all(done == total for _, done, total in seen)
    assert np.array_equal(first.lag_d, again.lag_d, equal_nan=True)


@pytest.mark.slow
def test_two_workers_give_the_same_bytes(setting, prospect):
    jobs = [Job(setting, prospect, layout, 25) for layout in LAYOUTS]
    for one, two in zip(run(jobs), run(jobs, workers=2), strict=True):
        for name in ("lag_d", "lag_lo_d", "r_max", "epochs_line", "claim", "reason"):
            assert getattr(one, name).tobytes() == getattr(two, name).tobytes(), name
