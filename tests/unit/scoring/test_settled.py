"""Resampling that ends when the verdict is beyond doubt, and verdicts that stay the same."""

from dataclasses import replace

import numpy as np
import pytest

from planner.model.campaign import Layout
from planner.recovery.lag import LagResult
from planner.scoring import recovering, setting_of
from planner.scoring.recovering import settled
from planner.scoring.trials import Task, run_trials

LAYOUTS = (Layout(3, 1, 120, 1), Layout(6, 1, 60, 1), Layout(4, 1, 90, 1))


def result(lag=10.0, half=1.0, drawn=24, **values):
    none = np.empty(0)
    plain = {
        "lag_d": lag, "lag_lo_d": lag - half, "lag_hi_d": lag + half, "centroid_d": lag,
        "r_max": 0.9, "peak_d": lag, "share": 1.0, "in_peak": 1.0, "aliases": (), "reason": "",
        "lags_d": none, "r": none, "centroids_d": np.zeros(drawn), "drawn": drawn,
        "scatter_d": half, "rival": 0.0,
    }  # fmt: skip
    return LagResult(**plain | values)


@pytest.mark.parametrize(
    ("found", "truth", "sure"),
    [
        (result(), 10.0, True),
        (result(), None, True),
        (result(half=2.4), 10.0, False),
        (result(half=2.4, drawn=90), 10.0, True),
        (result(half=8.0), 10.0, True),
        (result(half=3.4), 10.0, False),
        (result(lag=-10.0), 10.0, True),
        (result(), 13.8, False),
        (result(), 7.6, False),
        (result(), 20.0, True),
        (result(scatter_d=4.0), 10.0, False),
        (result(rival=0.9), 10.0, False),
        (result(rival=0.1), 10.0, True),
        (result(in_peak=0.6, aliases=((40.0, 0.4),)), 10.0, False),
        (result(in_peak=0.3, aliases=((40.0, 0.7),)), 10.0, False),
        (result(in_peak=0.1, aliases=((40.0, 0.1), (70.0, 0.1))), 10.0, True),
        (result(share=0.6), 10.0, False),
        (result(share=0.0, reason="none gave a lag"), 10.0, True),
        (result(share=0.45, reason="few gave a lag"), 10.0, False),
    ],
)
def test_only_what_is_far_from_every_cut_is_settled(campaign, found, truth, sure):
    rule = replace(
        campaign.success, within=0.3, error_below=0.3, sigma_above=2.0, in_peak_above=0.5
    )
    assert settled(found, 100, rule, truth) is sure


def test_a_claim_that_another_method_must_confirm_is_drawn_in_full(campaign):
    rule = replace(campaign.success, agree=True)
    assert not settled(result(), 100, rule, 10.0)
    assert settled(result(half=9.0), 100, rule, 10.0)


def test_a_rule_without_cuts_is_settled_by_the_sign_of_the_lag(campaign):
    rule = replace(campaign.success, error_below=np.inf, sigma_above=-np.inf, in_peak_above=0.0)
    assert settled(result(half=9.0), 100, rule)
    assert settled(result(lag=-10.0, half=3.0), 100, rule)
    assert not settled(result(lag=1.0, half=3.0), 100, rule)


def test_more_resamples_to_come_leave_more_doubt(campaign):
    rule = campaign.success
    found = result(half=2.1, drawn=48)
    assert settled(found, 60, rule)
    assert not settled(found, 10_000, rule)


@pytest.mark.slow
def test_verdicts_stay_those_of_all_resamples(campaign, prospect, monkeypatch):
    """At least 99.5 % of them: the standard errors of 99.9 % leave room for what is not Gaussian.
    The targets are chosen to lie near the cuts, where most is in doubt."""
    setting = replace(setting_of(campaign), simulation=replace(campaign.simulation, resamples=100))
    drawn = []
    cases = [
        replace(
            prospect,
            forecast=replace(
                prospect.forecast, lag_obs_d=lag, amplitude_mag=0.15, timescale_obs_d=60.0
            ),
        )
        for lag in (8.0, 16.0, 30.0)
    ]

    def spy(found, **options):
        sure = settled(found, **options)
        drawn.append((found.drawn, sure))
        return sure

    def outcomes(decide):
        monkeypatch.setattr(recovering, "settled", decide)
        limits = (-np.inf,) * len(LAYOUTS)
        tables = [run_trials(Task(setting, p, LAYOUTS, None, 0, 60, limits)) for p in cases]
        return np.stack([[t["claim"], t["success"]] for t in tables])

    early, full = outcomes(spy), outcomes(lambda *_, **__: False)
    assert full[:, 0].mean() > 0.2
    assert sum(sure for _, sure in drawn) > 0.5 * len([d for d, _ in drawn if d == 24])
    assert np.mean((early == full).all(axis=1)) >= 0.995
