"""The exact joint covariance of what is drawn, against quadrature of the definition.

A drawn pair is linear in its deviates, so feeding unit vectors instead of deviates gives the
linear map, and its product with itself is the covariance, without any sampling error.
"""

import numpy as np
import pytest
from scipy.integrate import quad

from planner.lightcurves import draw_pair

TAU, LAG = 30.0, 12.0
T_CONTINUUM = np.array([0.0, 3.0, 3.0, 10.5, 40.0, 300.0])
T_LINE = np.array([14.0, 2.0, 15.5, 60.0])


class UnitVector:
    """Stands in for a generator: the deviates are all zero but one."""

    def __init__(self, place):
        self.place = place

    def standard_normal(self, shape):
        deviates = np.zeros(shape)
        deviates.flat[self.place] = 1.0
        return deviates


def drawn_covariance(width):
    deviates = 2 * (T_CONTINUUM.size + 2 * T_LINE.size if width else T_CONTINUUM.size + T_LINE.size)
    columns = [
        np.concatenate(draw_pair(UnitVector(i), T_CONTINUUM, T_LINE, TAU, LAG, width))
        for i in range(deviates)
    ]
    linear_map = np.array(columns).T
    return linear_map @ linear_map.T


def covariance_of_means(a, b):
    """Covariance of the walk's means over two windows (start, end), by nested quadrature."""

    def with_point(s):
        if b[0] == b[1]:
            return np.exp(-abs(s - b[0]) / TAU)
        kink = [s] if b[0] < s < b[1] else None
        value = quad(lambda u: np.exp(-abs(s - u) / TAU), *b, points=kink, epsabs=1e-12)[0]
        return value / (b[1] - b[0])

    if a[0] == a[1]:
        return with_point(a[0])
    kinks = [u for u in set(b) if a[0] < u < a[1]]
    return quad(with_point, *a, points=kinks or None, epsabs=1e-12)[0] / (a[1] - a[0])


@pytest.mark.parametrize("width", [0.0, 5.0, 24.0])
def test_joint_covariance_is_that_of_the_definition(width):
    windows = [(t, t) for t in T_CONTINUUM]
    windows += [(t - LAG - width / 2, t - LAG + width / 2) for t in T_LINE]
    expected = np.array([[covariance_of_means(a, b) for b in windows] for a in windows])
    np.testing.assert_allclose(drawn_covariance(width), expected, rtol=0, atol=1e-10)


def test_one_step_has_the_published_mean_and_variance():
    """MacLeod et al. 2010, ApJ 721, 1014, eq. 5, with SF_inf^2 / 2 = 1 and zero mean."""
    x = np.array([draw_pair(UnitVector(i), [0.0, 9.0], [], TAU, LAG, 0.0)[0] for i in (0, 1, 2, 3)])
    np.testing.assert_allclose(x[:, 0], [1.0, 0.0, 0.0, 0.0], atol=1e-15)
    np.testing.assert_allclose(
        x[:, 1], [np.exp(-9.0 / TAU), 0.0, np.sqrt(1 - np.exp(-18.0 / TAU)), 0.0], atol=1e-15
    )
