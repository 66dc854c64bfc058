import dataclasses

import numpy as np
import pytest

from planner.lightcurves import disturbed_noise
from planner.model.disturbance import DISTURBANCES, Disturbance

T = np.arange(0.0, 400.0)
NORMALS = np.random.default_rng(3).standard_normal(T.size)
NOISY = {"outliers", "underestimated errors", "correlated errors"}


def noise(disturbance, t=T, normals=NORMALS):
    return disturbed_noise(np.random.default_rng(8), t, normals, disturbance)


def test_each_disturbance_stands_under_its_name_and_changes_something():
    plain = dataclasses.replace(DISTURBANCES["none"], name="", meaning="", source="")
    for key, disturbance in DISTURBANCES.items():
        assert disturbance.name == key
        assert disturbance.meaning
        assert disturbance.source
        bare = dataclasses.replace(disturbance, name="", meaning="", source="")
        assert (bare == plain) == (key == "none")
    assert bare != plain
    assert plain == Disturbance("", "", "")
    assert next(iter(DISTURBANCES)) == "none"


@pytest.mark.parametrize("name", DISTURBANCES)
def test_noise_is_left_alone_unless_the_disturbance_concerns_it(name):
    rng = np.random.default_rng(8)
    before = rng.bit_generator.state
    result = disturbed_noise(rng, T, NORMALS, DISTURBANCES[name])
    assert (result is NORMALS) == (name not in NOISY)
    assert (rng.bit_generator.state == before) == (
        name in DISTURBANCES.keys() - NOISY or name == "underestimated errors"
    )


def test_underestimated_errors_stretch_every_deviate():
    np.testing.assert_allclose(noise(DISTURBANCES["underestimated errors"]), 1.5 * NORMALS)


def test_outliers_leave_the_other_measurements_as_they_were():
    outliers = DISTURBANCES["outliers"]
    changed = noise(outliers) != NORMALS
    assert 5 <= np.count_nonzero(changed) <= 40  # 20 expected of 400
    added = (noise(outliers) - NORMALS)[changed]
    assert 4.0 < np.sqrt(np.mean(added**2)) < 12.0


def test_correlated_part_depends_on_the_night_alone():
    """Equal epochs share it, and the order of epochs does not matter."""
    whole = Disturbance("all", "", "", correlated_share=1.0, correlation_time_d=5.0)
    twice = np.concatenate([T, T])
    deviates = noise(whole, twice, np.zeros(twice.size))
    np.testing.assert_array_equal(deviates[: T.size], deviates[T.size :])
    backwards = noise(whole, T[::-1], np.zeros(T.size))
    np.testing.assert_array_equal(backwards[::-1], noise(whole, T, np.zeros(T.size)))


def test_correlation_over_no_time_is_refused():
    with pytest.raises(ValueError, match="correlation_time_d"):
        noise(Disturbance("none", "", "", correlated_share=0.5))
