"""A scale error that line and continuum share makes a false peak at zero lag; images cure it."""

import importlib.util
from pathlib import Path

import numpy as np
import pytest

from planner.scoring import setting_of

spec = importlib.util.spec_from_file_location(
    "shared_scale", Path(__file__).with_name("shared_scale.py")
)
shared_scale = importlib.util.module_from_spec(spec)
spec.loader.exec_module(shared_scale)


@pytest.mark.slow
@pytest.mark.statistical
def test_shared_scale_errors_peak_at_zero_lag_and_images_remove_that(campaign, prospect):
    at_zero, right = {}, {}
    for source in ("spectra", "imaging"):
        peak, true = shared_scale.peaks(setting_of(campaign), prospect, source)
        at_zero[source] = np.mean(np.abs(peak) < 3.0)
        right[source] = np.mean(np.abs(peak - true) < 0.3 * true)
    assert at_zero["spectra"] > 0.5
    assert at_zero["imaging"] < 0.1
    assert right["imaging"] > right["spectra"] + 0.3
