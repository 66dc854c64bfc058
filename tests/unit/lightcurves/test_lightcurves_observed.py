import numpy as np
import pytest

from planner.lightcurves import observed_continuum, observed_line
from planner.lightcurves.observed import FRACTION_PER_MAG


def test_small_magnitude_changes_become_flux_changes():
    small_mag = 1e-5
    assert pytest.approx((10 ** (0.4 * small_mag) - 1) / small_mag, rel=1e-5) == FRACTION_PER_MAG


def test_host_dilutes_the_continuum_and_responsivity_scales_the_line():
    x, error, normals = np.array([0.0, 1.0, -2.0]), np.array([0.01, 0.02, 0.03]), np.ones(3)
    s = FRACTION_PER_MAG * 0.2
    np.testing.assert_allclose(
        observed_continuum(x, 0.2, 0.5, error, normals),
        [1.01, 1.02 + 0.5 * s, 1.03 - s],
        rtol=1e-14,
    )
    np.testing.assert_allclose(
        observed_line(x, 0.2, 0.7, 0.01, normals),
        [1.01, 1.01 + 0.7 * s, 1.01 - 1.4 * s],
        rtol=1e-14,
    )
