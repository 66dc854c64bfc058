"""Thinning a season keeps most of its lags."""

import importlib.util
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from planner.model.campaign import Layout
from planner.scoring import Job, setting_of

spec = importlib.util.spec_from_file_location(
    "coverage_to", Path(__file__).with_name("recovery_cases.py")
)
coverage = importlib.util.module_from_spec(spec)
spec.loader.exec_module(coverage)

TWICE_WEEKLY, THINNED = Layout(3.5, 2.0, 180.0, 1), Layout(10.5, 2.0, 180.0, 1)


@pytest.mark.slow
@pytest.mark.statistical
def test_a_third_of_the_spectra_keeps_most_lags(campaign, prospect):
    """About 90 % (Homayouni et al. 2024, arXiv:2412.06885: twice weekly to every 1.5 weeks).

    No lag is compared with unrelated lines here, nor was in the published cuts (from memory).
    Images every other night.
    """
    forecast = replace(prospect.forecast, lag_obs_d=20.0, timescale_obs_d=60.0)
    line = replace(prospect.line[0], flux_error=np.full(181, 0.03))
    case = replace(prospect, forecast=forecast, line=(line,))
    setting = setting_of(campaign)
    setting = replace(
        setting,
        simulation=replace(setting.simulation, method="likelihood"),
        success=replace(coverage.USUAL, false_alarm_below=1.0),
    )
    tables = coverage.run([Job(setting, case, la, 40) for la in (TWICE_WEEKLY, THINNED)])
    often, seldom = (table.success.sum() for table in tables)
    assert tables[1].epochs_line.mean() < 0.45 * tables[0].epochs_line.mean()
    assert often > 25
    # Errors of the ratio at 40 paired trials: about 0.06.
    assert 0.9 - 3 * 0.06 < seldom / often < 1.0
