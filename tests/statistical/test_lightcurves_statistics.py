"""2000 drawn pairs against the closed forms of the damped random walk and its top-hat response."""

import numpy as np
import pytest

from planner.lightcurves import draw_pair

pytestmark = [pytest.mark.statistical, pytest.mark.slow]

TAU, LAG, WIDTH = 40.0, 16.0, 20.0
CURVES = 2000
T = np.arange(0.0, 120.0, 2.0)


def covariance_line_driver(dt):
    """Covariance of y(t + dt) with x(t): mean of exp(-|s| / tau) over the response's window."""

    def primitive(s):
        return np.sign(s) * TAU * -np.expm1(-np.abs(s) / TAU)

    return (primitive(dt - LAG + WIDTH / 2) - primitive(dt - LAG - WIDTH / 2)) / WIDTH


def covariance_line(dt):
    """Covariance of y(t + dt) with y(t): second difference of the double primitive."""

    def double(s):
        return TAU * np.abs(s) + TAU**2 * np.expm1(-np.abs(s) / TAU)

    return (double(dt + WIDTH) - 2 * double(dt) + double(dt - WIDTH)) / WIDTH**2


@pytest.fixture(scope="module")
def curves():
    """Continuum and line at the same epochs, two arrays (curves, epochs)."""
    rng = np.random.default_rng(20240611)
    pairs = [draw_pair(rng, T, T, TAU, LAG, WIDTH) for _ in range(CURVES)]
    return np.array([x for x, _ in pairs]), np.array([y for _, y in pairs])


def assert_mean(samples, expected, sigmas=4.5):
    """Each column's mean equals the expectation within its own standard error.

    One value for each curve and column, so that curves are independent; 4.5 sigma leaves a chance
    of 7e-6 for each of the fewer than two hundred comparisons here.
    """
    error = samples.std(axis=0, ddof=1) / np.sqrt(len(samples))
    assert np.all(error < 0.1)
    np.testing.assert_array_less(np.abs(samples.mean(axis=0) - expected), sigmas * error)


def test_mean_and_variance(curves):
    for curve, variance in zip(curves, (1.0, covariance_line(0.0)), strict=True):
        assert_mean(curve, 0.0)
        assert_mean(curve**2, variance)


def test_autocorrelation(curves):
    steps = np.array([1, 3, 10, 25, 50])
    x, y = curves
    of_x = np.array([(x[:, n:] * x[:, :-n]).mean(axis=1) for n in steps]).T
    of_y = np.array([(y[:, n:] * y[:, :-n]).mean(axis=1) for n in steps]).T
    assert_mean(of_x, np.exp(-2.0 * steps / TAU))
    assert_mean(of_y, covariance_line(2.0 * steps))


def test_structure_function(curves):
    """SF = sqrt(2) sigma sqrt(1 - exp(-dt / tau)), MacLeod et al. 2010, eq. 4 with SF_inf."""
    steps = np.array([1, 3, 10, 25, 50])
    x, _ = curves
    squares = np.array([((x[:, n:] - x[:, :-n]) ** 2).mean(axis=1) for n in steps]).T
    assert_mean(squares, (np.sqrt(2.0) * np.sqrt(1.0 - np.exp(-2.0 * steps / TAU))) ** 2)


def test_joint_covariance_of_line_and_driver(curves):
    x, y = curves
    i, j = np.array([30, 30, 30, 30, 30]), np.array([10, 30, 35, 38, 55])
    assert_mean(y[:, j] * x[:, i], covariance_line_driver(2.0 * (j - i)))


def test_mean_delay_of_the_line_is_the_lag(curves):
    """First moment of the sampled cross-covariance about the lag, over lags symmetric about it."""
    x, y = curves
    lags = LAG + 2.0 * np.arange(-15, 16)
    products = []
    for n in (lags / 2).astype(int):
        later, earlier = y[:, max(n, 0) : T.size + min(n, 0)], x[:, max(-n, 0) : T.size - max(n, 0)]
        products.append((later * earlier).mean(axis=1))
    products = np.array(products).T
    assert_mean(((lags - LAG) * products).mean(axis=1)[:, None], 0.0)
    with pytest.raises(AssertionError):  # a delay wrong by 2 d would be seen
        assert_mean(((lags - LAG - 2.0) * products).mean(axis=1)[:, None], 0.0)


def test_variance_within_a_campaign_falls_short_of_the_asymptotic_one():
    """Sample variance over a duration T: 1 - 2 (tau/T) [1 - (tau/T) (1 - exp(-T/tau))]."""
    rng = np.random.default_rng(77)
    for duration in (40.0, 120.0):
        t = np.linspace(0.0, duration, 201)
        seen = []
        for _ in range(1000):
            x, _ = draw_pair(rng, t, np.empty(0), TAU, LAG, WIDTH)
            mean = np.trapezoid(x, t) / duration
            seen.append(np.trapezoid((x - mean) ** 2, t) / duration)
        ratio = TAU / duration
        expected = 1 - 2 * ratio * (1 - ratio * -np.expm1(-1 / ratio))
        assert_mean(np.array(seen)[:, None], expected)
