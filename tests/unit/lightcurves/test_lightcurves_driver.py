import math
from decimal import Decimal, localcontext

import numpy as np
import pytest

from planner.kernels.ou_process import integral_variance, ou_path
from planner.lightcurves import draw_pair


def plain_path(t, tau, normals):
    """The walk and its integral, as the textbook moments give them, in extended precision."""
    t, normals = t.astype(np.longdouble), normals.astype(np.longdouble)
    x, integral = [normals[0, 0]], [np.longdouble(0)]
    for dt, (z1, z2) in zip(np.diff(t), normals[1:], strict=True):
        a = np.exp(-dt / tau)
        var_x = 1 - a**2
        cov = tau * (1 - a) ** 2
        var_i = tau**2 * (2 * dt / tau - 3 + 4 * a - a**2)
        shared = cov / np.sqrt(var_x) if var_x > 0 else np.longdouble(0)
        rest = np.sqrt(max(var_i - shared**2, np.longdouble(0)))
        integral.append(integral[-1] + tau * (1 - a) * x[-1] + shared * z1 + rest * z2)
        x.append(a * x[-1] + np.sqrt(var_x) * z1)
    return np.array(x, dtype=float), np.array(integral, dtype=float)


def test_kernel_equals_the_plain_twin():
    rng = np.random.default_rng(11)
    t = np.sort(rng.integers(0, 4000, 500) / 16.0)
    assert np.any(np.diff(t) == 0.0)
    normals = rng.standard_normal((t.size, 2))
    for tau in (0.7, 40.0, 300.0):
        np.testing.assert_allclose(
            np.array(ou_path(t, tau, normals)), plain_path(t, tau, normals), rtol=1e-10, atol=1e-10
        )


@pytest.mark.parametrize("u", [1e-12, 1e-6, 1e-3, 0.1, 0.299999, 0.300001, 1.0, 20.0])
def test_variance_of_the_integral_keeps_its_digits_in_tiny_steps(u):
    with localcontext() as context:
        context.prec = 60
        d = Decimal(u)
        exact = float(2 * d - 3 + 4 * (-d).exp() - (-2 * d).exp())
    assert integral_variance(u) == pytest.approx(exact, rel=1e-12)


def test_order_of_epochs_does_not_matter_and_ties_are_one_value():
    t_continuum, t_line = np.array([5.0, 1.0, 5.0, 9.0]), np.array([8.0, 3.0, 3.0])
    x, y = draw_pair(np.random.default_rng(3), t_continuum, t_line, 20.0, 2.0, 1.0)
    assert x[0] == x[2]
    assert y[1] == y[2]
    assert len({*x, *y}) == 5


def test_sharp_response_repeats_the_driver_one_lag_later():
    t = np.arange(0.0, 30.0)
    x, y = draw_pair(np.random.default_rng(4), t, t + 7.0, 20.0, 7.0, 0.0)
    np.testing.assert_array_equal(x, y)


def test_narrow_response_tends_to_the_sharp_one():
    t = np.arange(0.0, 30.0)
    x, y = draw_pair(np.random.default_rng(4), t, t + 7.0, 20.0, 7.0, 1e-4)
    # within the window the walk strays by about sqrt(2 width / tau)
    np.testing.assert_allclose(y, x, atol=6 * math.sqrt(2e-4 / 20.0))
    assert not np.array_equal(x, y)


def test_response_is_the_mean_of_the_driver_over_its_window():
    fine = np.arange(0.0, 20.0, 0.002)
    x, y = draw_pair(np.random.default_rng(5), fine, np.array([25.0]), 30.0, 15.0, 8.0)
    inside = (fine >= 6.0) & (fine <= 14.0)
    assert y[0] == pytest.approx(np.trapezoid(x[inside], fine[inside]) / 8.0, abs=2e-3)


def test_integral_keeps_its_precision_over_a_long_campaign_of_a_fast_walk():
    """Differences of the running integral against those of the same walk in extended precision."""
    rng = np.random.default_rng(6)
    centre = np.sort(rng.uniform(60000.0, 63650.0, 500)) - 60000.0
    width, tau = 0.05, 0.5
    t = np.sort(np.concatenate([centre, centre + width]))
    normals = rng.standard_normal((t.size, 2))
    _, integral = ou_path(t, tau, normals)
    _, exact = plain_path(t, tau, normals)
    late, early = np.searchsorted(t, centre + width), np.searchsorted(t, centre)
    mean = (integral[late] - integral[early]) / width
    np.testing.assert_allclose(mean, (exact[late] - exact[early]) / width, atol=1e-10)


def test_nothing_to_draw_gives_nothing():
    x, y = draw_pair(np.random.default_rng(0), np.empty(0), np.empty(0), 20.0, 2.0, 1.0)
    assert x.shape == y.shape == (0,)
    x, y = draw_pair(np.random.default_rng(0), np.arange(3.0), np.empty(0), 20.0, 2.0, 0.0)
    assert x.shape == (3,)
    assert y.shape == (0,)


@pytest.mark.parametrize(("tau", "width"), [(0.0, 1.0), (-1.0, 1.0), (math.nan, 1.0), (9.0, -1.0)])
def test_impossible_process_is_refused(tau, width):
    with pytest.raises(ValueError, match="need tau_d > 0 and width_d >= 0"):
        draw_pair(np.random.default_rng(0), np.arange(3.0), np.arange(3.0), tau, 2.0, width)
