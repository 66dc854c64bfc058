"""The forecast without recoveries agrees with recoveries."""

import importlib.util
from pathlib import Path

import numpy as np
import pytest

spec = importlib.util.spec_from_file_location(
    "forecast_against_trials", Path(__file__).with_name("forecast_against_trials.py")
)
forecast_against_trials = importlib.util.module_from_spec(spec)
spec.loader.exec_module(forecast_against_trials)


@pytest.mark.slow
@pytest.mark.statistical
def test_expected_success_follows_that_of_recoveries():
    """A dozen layouts; with 12 recoveries chance alone makes a mean difference of up to 0.11."""
    expected, recovered, _ = forecast_against_trials.bench_information.compare(
        12, 12, show=lambda _: None
    )
    assert np.ptp(expected) > 0.6
    assert np.corrcoef(expected, recovered)[0, 1] > 0.85
    assert np.abs(expected - recovered).mean() < 0.15
