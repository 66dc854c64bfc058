"""68 % intervals of the resampled correlation are not far too short where data are dense."""

import importlib.util
from pathlib import Path

import pytest
from scipy.stats import binom

spec = importlib.util.spec_from_file_location(
    "coverage_in", Path(__file__).with_name("recovery_cases.py")
)
coverage = importlib.util.module_from_spec(spec)
spec.loader.exec_module(coverage)

pytestmark = [pytest.mark.slow, pytest.mark.statistical]


@pytest.mark.parametrize("rule", [coverage.ANY_LAG, coverage.USUAL], ids=["every lag", "claims"])
def test_dense_intervals_hold_the_truth(campaign, prospect, rule):
    """At least as often as chance allows (1 in 1000) at a true coverage of 63 %."""
    job = coverage.job_of("dense", campaign, prospect, "correlation", 120, rule=rule)
    held, claim = coverage.inside(coverage.run([job])[0])
    counted = held if rule is coverage.ANY_LAG else held[claim]
    assert counted.size > 40
    assert counted.sum() >= binom.ppf(1e-3, counted.size, 0.63)
