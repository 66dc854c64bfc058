"""Draws of a trial, of its unrelated lines, and of the sky they share."""

from dataclasses import replace

import numpy as np
import pytest

from planner.scoring import setting_of
from planner.scoring.draws import UNRELATED, draw_strangers, draw_trial, sky_of_trial


@pytest.fixture
def setting(campaign):
    return setting_of(campaign)


def test_unrelated_lines_replace_the_line_and_nothing_else(setting, prospect):
    own = draw_trial(setting, prospect, 5)
    strangers = draw_strangers(setting, prospect, 5)
    stand_in = draw_trial(replace(setting, unrelated=True), prospect, 5)
    assert len(strangers) == UNRELATED
    for draw in (*strangers, stand_in):
        assert draw.lag_obs_d == own.lag_obs_d
        for mine, its in zip(own.continuum, draw.continuum, strict=True):
            assert np.array_equal(mine.flux, its.flux)
        assert all(np.array_equal(own.usable[name], draw.usable[name]) for name in own.usable)
    lines = [draw.line[0].flux for draw in (own, *strangers, stand_in)]
    for i, one in enumerate(lines):
        assert not any(np.array_equal(one, other) for other in lines[:i])


def test_unrelated_lines_vary_as_much_as_the_line(setting, prospect):
    """400 trials: the mean squares of fluxes about 1 agree within three standard errors."""
    quiet = replace(prospect, line=(replace(prospect.line[0], flux_error=np.full(181, 1e-6)),))
    own, strange = [], []
    for trial in range(400):
        own.append(np.mean((draw_trial(setting, quiet, trial).line[0].flux - 1.0) ** 2))
        drawn = draw_strangers(setting, quiet, trial)
        strange.append(np.mean([(d.line[0].flux - 1.0) ** 2 for d in drawn]))
    difference = np.array(own) - np.array(strange)
    assert abs(difference.mean()) < 3 * difference.std() / 20


def test_the_sky_is_shared_and_cannot_be_written_to(setting):
    first, again = sky_of_trial(setting, 3), sky_of_trial(setting, 3)
    assert first is not again
    for name, nights in first.items():
        assert np.array_equal(nights, again[name])
        with pytest.raises(ValueError, match="read-only"):
            nights[0] = False
    other = sky_of_trial(replace(setting, seed=setting.seed + 1), 3)
    assert any(not np.array_equal(first[name], other[name]) for name in first)
