import numpy as np
import pytest

from planner.lightcurves import continuum_flux, line_flux
from planner.lightcurves.fluxes import FRACTION_PER_MAG


def test_small_magnitude_changes_become_flux_changes():
    small_mag = 1e-5
    assert pytest.approx((10 ** (0.4 * small_mag) - 1) / small_mag, rel=1e-5) == FRACTION_PER_MAG


def test_host_dilutes_the_continuum_and_responsivity_scales_the_line():
    x, s = np.array([0.0, 1.0, -2.0]), FRACTION_PER_MAG * 0.2
    np.testing.assert_allclose(continuum_flux(x, 0.2, 0.5), [1, 1 + 0.5 * s, 1 - s], rtol=1e-14)
    np.testing.assert_allclose(line_flux(x, 0.2, 0.7), [1, 1 + 0.7 * s, 1 - 1.4 * s], rtol=1e-14)
