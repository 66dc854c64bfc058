"""Unrelated lines are claimed as lags no more often than the usual cuts allow."""

import importlib.util
from pathlib import Path

import pytest
from scipy.stats import betabinom, binom

from planner.scoring.draws import UNRELATED
from planner.scoring.limits import TRIALS

spec = importlib.util.spec_from_file_location(
    "coverage_of", Path(__file__).with_name("recovery_cases.py")
)
coverage = importlib.util.module_from_spec(spec)
spec.loader.exec_module(coverage)

pytestmark = [pytest.mark.slow, pytest.mark.statistical]

ALLOWED = coverage.USUAL.false_alarm_below
CHANCE = 1e-3


def claims(campaign, prospect, case, method, trials, rule=coverage.USUAL):
    job = coverage.job_of(case, campaign, prospect, method, trials, rule=rule, unrelated=True)
    return int(coverage.run([job])[0].claim.sum())


def most_by_correlation(trials):
    """Claims that chance exceeds once in a thousand times, at the allowed rate.

    The limit is a quantile of known unrelated lines: how often a further line exceeds it follows
    a beta distribution.
    """
    known = TRIALS * UNRELATED
    over = ALLOWED * known + 1
    return betabinom.ppf(1 - CHANCE, trials, over, known + 1 - over)


@pytest.mark.parametrize("case", coverage.CASES)
def test_correlation_claims_few_unrelated_lines(campaign, prospect, case):
    assert claims(campaign, prospect, case, "correlation", 60) <= most_by_correlation(60)


@pytest.mark.parametrize("case", coverage.CASES)
def test_likelihood_claims_few_unrelated_lines(campaign, prospect, case):
    found = claims(campaign, prospect, case, "likelihood", 12)
    assert found <= binom.ppf(1 - CHANCE, 12, ALLOWED)


def test_the_correlation_limit_is_needed(campaign, prospect):
    """Without the comparison with unrelated lines, high correlation alone passes far more."""
    rule = coverage.replace(coverage.USUAL, false_alarm_below=1.0)
    found = claims(campaign, prospect, "sparse", "correlation", 60, rule)
    assert found > most_by_correlation(60)
