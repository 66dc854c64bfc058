"""Many disturbed draws against what each disturbance is meant to be."""

import numpy as np
import pytest

from planner.lightcurves import disturbed_noise, draw_disturbed_pair
from planner.model.disturbance import DISTURBANCES

pytestmark = [pytest.mark.statistical, pytest.mark.slow]


def assert_mean(samples, expected, sigmas=4.5):
    """The mean of independent samples is as expected; 4.5 sigma leaves a chance of 7e-6 each."""
    error = samples.std(axis=0, ddof=1) / np.sqrt(len(samples))
    np.testing.assert_array_less(np.abs(samples.mean(axis=0) - expected), sigmas * error)
    return error


def pairs(name, count, t, tau, lag, width, seed=31):
    rng = np.random.default_rng(seed)
    drawn = [
        draw_disturbed_pair(rng, t, t, tau, lag, width, DISTURBANCES[name]) for _ in range(count)
    ]
    return np.array([x for x, _ in drawn]), np.array([y for _, y in drawn])


@pytest.mark.parametrize(
    "name", ["none", "wide response", "skewed response", "power-law variability"]
)
def test_centroid_of_the_cross_covariance_is_the_lag(name):
    """First moment about the lag of the sampled cross-covariance, out to where it has vanished."""
    tau, lag, span = 4.0, 6.0, 300
    x, y = pairs(name, 1500, np.arange(0.0, span), tau, lag, 6.0)
    assert_mean((x**2).mean(axis=1), 1.0)
    delays = np.arange(-40, 53)
    window = slice(60, span - 60)  # the same line epochs at every delay
    products = np.array([(np.roll(x, n, axis=1) * y)[:, window].mean(axis=1) for n in delays]).T
    moment = ((delays - lag) * products).sum(axis=1)
    error = assert_mean(moment, 0.0)
    # The area under the covariance is that under the driver's own; a lag wrong by 1 d is seen.
    assert 4.5 * error < products.sum(axis=1).mean()


def slope_of_spectrum(x, step):
    """Mean periodogram, tapered so that slow power does not leak, between 1/40 and 1/8 per day."""
    taper = np.hanning(x.shape[1])
    power = (np.abs(np.fft.rfft(x * taper, axis=1)) ** 2).mean(axis=0)
    frequency = np.fft.rfftfreq(x.shape[1], step)
    use = (frequency > 1 / 40) & (frequency < 1 / 8)
    return np.polyfit(np.log(frequency[use]), np.log(power[use]), 1)[0]


def test_power_law_falls_more_steeply_than_the_walk():
    t = 0.5 * np.arange(1024)
    slopes = {
        name: slope_of_spectrum(pairs(name, 300, t, 80.0, 10.0, 5.0)[0], 0.5)
        for name in ("none", "power-law variability")
    }
    assert slopes["none"] == pytest.approx(-2.0, abs=0.07)
    assert slopes["power-law variability"] == pytest.approx(-3.0, abs=0.07)


def test_noise_has_the_size_memory_and_outliers_it_is_meant_to_have():
    rng = np.random.default_rng(12)
    t = np.arange(0.0, 200.0)
    steps = np.array([1, 2, 5, 10, 20])

    def drawn(name):
        return np.array(
            [
                disturbed_noise(rng, t, rng.standard_normal(t.size), DISTURBANCES[name])
                for _ in range(1500)
            ]
        )

    correlated, quoted = drawn("correlated errors"), DISTURBANCES["correlated errors"]
    assert_mean((correlated**2).mean(axis=1), 1.0)
    products = np.array([(correlated[:, n:] * correlated[:, :-n]).mean(axis=1) for n in steps]).T
    memory = np.exp(-steps / quoted.correlation_time_d)
    assert_mean(products, quoted.correlated_share * memory)

    outliers, quoted = drawn("outliers"), DISTURBANCES["outliers"]
    assert_mean((outliers**2).mean(axis=1), 1.0 + quoted.outlier_share * quoted.outlier_sigma**2)
    # Beyond 5 errors: hardly any of the ordinary, of outliers those beyond 5 / sqrt(1 + 8^2).
    beyond = 0.5351  # 2 (1 - Phi(0.62017)), table of the normal distribution
    assert_mean((np.abs(outliers) > 5.0).mean(axis=1), quoted.outlier_share * beyond)

    assert_mean((drawn("underestimated errors") ** 2).mean(axis=1), 1.5**2)


def test_stopped_line_is_still_for_its_share_of_the_time():
    t = np.arange(0.0, 181.0)
    _, y = pairs("line stops following", 400, t, 60.0, 15.0, 10.0)
    still = (np.diff(y, axis=1) == 0.0).mean(axis=1)
    share = DISTURBANCES["line stops following"].decoupled_share
    assert np.all(np.abs(still - share) <= 1.0 / 180)
    # Var(y) of the following line, 2 r (1 - r (1 - exp(-1 / r))) with r = tau / width, all along.
    ratio = 60.0 / 10.0
    assert_mean(y**2, 2 * ratio * (1 - ratio * -np.expm1(-1 / ratio)))
