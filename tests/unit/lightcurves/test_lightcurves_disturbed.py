"""Disturbed pairs: what stays byte-identical, what changes, and exact covariances on the grid."""

import numpy as np
import pytest
from scipy.integrate import quad

from planner.lightcurves import draw_disturbed_pair, draw_pair
from planner.lightcurves.power_law import power_law_path
from planner.model.disturbance import DISTURBANCES, Disturbance

TAU, LAG, WIDTH = 60.0, 40.0, 24.0
T_CONTINUUM = np.array([0.0, 3.3, 3.3, 10.5, 40.0, 90.0])
T_LINE = np.array([14.0, 2.7, 55.5, 60.0])
NIGHTS = np.r_[0.0:180.0, 365.0:500.0]


def drawn(disturbance, seed=5, t=NIGHTS):
    return draw_disturbed_pair(np.random.default_rng(seed), t, t, TAU, LAG, WIDTH, disturbance)


def ordinary(width=WIDTH, seed=5):
    return draw_pair(np.random.default_rng(seed), NIGHTS, NIGHTS, TAU, LAG, width)


UNTOUCHED = ["none", "outliers", "underestimated errors", "correlated errors"]


@pytest.mark.parametrize("name", UNTOUCHED)
def test_pairs_are_the_ordinary_ones_bit_for_bit_where_only_noise_differs(name):
    for mine, plain in zip(drawn(DISTURBANCES[name]), ordinary(), strict=True):
        assert mine.tobytes() == plain.tobytes()


def test_thin_shell_is_the_exact_top_hat_of_twice_the_lag():
    for mine, plain in zip(drawn(DISTURBANCES["wide response"]), ordinary(2 * LAG), strict=True):
        assert mine.tobytes() == plain.tobytes()


def test_line_keeps_its_value_for_its_share_of_each_season():
    share = DISTURBANCES["line stops following"].decoupled_share
    starts = []
    for seed in range(20):
        x, y = drawn(DISTURBANCES["line stops following"], seed)
        x_plain, y_plain = ordinary(seed=seed)
        np.testing.assert_array_equal(x, x_plain)
        for season in (NIGHTS < 200, NIGHTS > 200):
            changed = np.flatnonzero(y[season] != y_plain[season])
            first = changed[0] - 1  # the first night of the stretch has its own value
            assert np.all(np.diff(changed) == 1)
            assert np.all(y[season][first : changed[-1] + 1] == y_plain[season][first])
            nights = np.count_nonzero(season)
            assert abs(changed.size + 1 - share * (nights - 1)) <= 1
            starts.append(first / nights)
    assert min(starts) < 0.1
    assert max(starts) > 0.55


def test_order_of_epochs_does_not_matter_to_a_stopped_line():
    shuffled = np.random.default_rng(1).permutation(NIGHTS.size)
    stops = DISTURBANCES["line stops following"]
    _, y = drawn(stops)
    _, mixed = drawn(stops, t=NIGHTS[shuffled])
    np.testing.assert_array_equal(mixed, y[shuffled])


def test_trend_is_a_straight_line_of_either_sign_on_top():
    trend = DISTURBANCES["slow trend"]
    changes = set()
    for seed in range(12):
        x, y = drawn(trend, seed)
        x_plain, y_plain = ordinary(seed=seed)
        np.testing.assert_array_equal(x, x_plain)
        added = y - y_plain
        middle = (NIGHTS - NIGHTS.mean()) @ added / ((NIGHTS - NIGHTS.mean()) ** 2).sum()
        np.testing.assert_allclose(added, middle * (NIGHTS - np.ptp(NIGHTS) / 2), atol=1e-12)
        changes.add(round(added[-1] - added[0], 9))
    assert changes == {trend.trend, -trend.trend}


class UnitVector:
    """Stands in for a generator: the deviates are all zero but one."""

    def __init__(self, place):
        self.place, self.size = place, 0

    def standard_normal(self, shape):
        deviates = np.zeros(shape)
        self.size = deviates.size
        if self.place is not None:
            deviates.flat[self.place] = 1.0
        return deviates


def drawn_covariance(disturbance, tau, lag, width):
    """A drawn pair is linear in its deviates, so unit vectors give its covariance exactly."""

    def pair(generator):
        return np.concatenate(
            draw_disturbed_pair(generator, T_CONTINUUM, T_LINE, tau, lag, width, disturbance)
        )

    counter = UnitVector(None)
    pair(counter)
    linear_map = np.array([pair(UnitVector(i)) for i in range(counter.size)]).T
    return linear_map @ linear_map.T


def expected_covariance(of_driver, with_line, of_line):
    """Joint covariance from the three functions of the time by which the second comes later."""
    every = np.concatenate([T_CONTINUUM, T_LINE])
    later = every - every[:, None]
    n = T_CONTINUUM.size
    expected = np.empty(later.shape)
    expected[:n, :n] = np.vectorize(of_driver)(later[:n, :n])
    expected[:n, n:] = np.vectorize(with_line)(later[:n, n:])
    expected[n:, :n] = expected[:n, n:].T
    expected[n:, n:] = np.vectorize(of_line)(later[n:, n:])
    return expected


@pytest.mark.parametrize("tau", [pytest.param(15.0, marks=pytest.mark.slow), TAU])
def test_skewed_response_has_the_covariance_of_its_definition(tau):
    """Gamma density of shape 2 and scale lag / 2; the walk at the continuum's epochs is exact."""
    scale = LAG / 2
    ends = {"epsabs": 1e-10, "limit": 400}

    def walk(dt):
        return np.exp(-abs(dt) / tau)

    def with_line(dt):
        peak = [dt] if dt > 0 else None
        return quad(
            lambda s: s / scale**2 * np.exp(-s / scale) * walk(dt - s), 0, 40 * scale,
            points=peak, **ends,
        )[0]  # fmt: skip

    def of_line(dt):
        def difference(s):  # density of the difference of two such delays
            return (abs(s) + scale) * np.exp(-abs(s) / scale) / (4 * scale**2)

        return quad(
            lambda s: difference(s) * walk(dt - s), -40 * scale, 40 * scale,
            points=sorted({0.0, dt}), **ends,
        )[0]  # fmt: skip

    covariance = drawn_covariance(DISTURBANCES["skewed response"], tau, LAG, WIDTH)
    expected = expected_covariance(walk, with_line, of_line)
    n = T_CONTINUUM.size
    np.testing.assert_allclose(covariance[:n, :n], expected[:n, :n], rtol=0, atol=1e-12)
    np.testing.assert_allclose(covariance, expected, rtol=0, atol=1e-3)


def power_law_covariance(dt, slope=3.0, tau=TAU):
    """Cosine transform of the bending power law."""

    def power(f):
        return slope * tau * np.sin(np.pi / slope) / (1 + (2 * np.pi * tau * f) ** slope)

    if dt == 0.0:
        return 2 * quad(power, 0, np.inf)[0]
    return 2 * quad(power, 0, np.inf, weight="cos", wvar=2 * np.pi * abs(dt))[0]


@pytest.mark.slow
def test_power_law_has_unit_variance_and_the_covariance_of_its_spectrum():
    covariance = drawn_covariance(DISTURBANCES["power-law variability"], TAU, LAG, 0.0)
    assert power_law_covariance(0.0) == pytest.approx(1.0)
    expected = expected_covariance(
        power_law_covariance, lambda dt: power_law_covariance(dt - LAG), power_law_covariance
    )
    np.testing.assert_allclose(covariance, expected, rtol=0, atol=1e-3)


def test_power_law_of_slope_2_is_the_damped_random_walk():
    """Covariance exp(-dt / tau), but for the variance beyond the grid's highest frequency."""
    tau, step, count = 20.0, 0.5, 60
    counter = UnitVector(None)
    power_law_path(counter, count, step, tau, 2.0)
    paths = np.array(
        [power_law_path(UnitVector(i), count, step, tau, 2.0) for i in range(counter.size)]
    )
    covariance = paths[:, 0] @ paths
    expected = np.exp(-step * np.arange(count) / tau)
    lost = 2 / np.pi**2 * step / tau
    assert covariance[0] == pytest.approx(1.0 - lost, abs=2e-4)
    np.testing.assert_allclose(covariance[1:], expected[1:], atol=0.5 * lost)


def test_power_law_and_any_response_go_together():
    """The line of a slow driver repeats it one mean delay later, whatever the response."""
    t = np.arange(0.0, 100.0)
    for response in ("top hat", "shell", "long tail"):
        slow = Disturbance("slow", "", "", response=response, driver_slope=3.0)
        x, y = draw_disturbed_pair(np.random.default_rng(2), t, t + 2.0, 3000.0, 2.0, 1.0, slow)
        assert np.abs(x - y).max() < 0.02 * np.ptp(x)
        assert np.all(x != y)


def test_empty_and_single_epochs_are_served():
    none, one = np.empty(0), np.array([3.0])
    for disturbance in DISTURBANCES.values():
        for t_continuum, t_line in ((none, none), (one, none), (none, one), (one, one)):
            x, y = draw_disturbed_pair(
                np.random.default_rng(1), t_continuum, t_line, TAU, LAG, WIDTH, disturbance
            )
            assert (x.size, y.size) == (t_continuum.size, t_line.size)
            assert np.all(np.isfinite(x))
            assert np.all(np.isfinite(y))


def test_long_campaigns_keep_to_a_bounded_grid():
    far = np.array([0.0, 4000.0])
    for name in ("skewed response", "power-law variability"):
        counter = UnitVector(None)
        draw_disturbed_pair(counter, far, far, 1000.0, 2.0, 1.0, DISTURBANCES[name])
        assert 12_000 < counter.size < 27_000


@pytest.mark.parametrize("name", ["none", "skewed response", "power-law variability"])
def test_impossible_numbers_are_refused(name):
    rng = np.random.default_rng(1)
    for tau, lag, width in ((0.0, 5.0, 1.0), (20.0, 5.0, -1.0), (np.nan, 5.0, 1.0)):
        if name == "skewed response" and width < 0:
            continue  # it has no use for a width
        with pytest.raises(ValueError, match="need"):
            draw_disturbed_pair(rng, NIGHTS, NIGHTS, tau, lag, width, DISTURBANCES[name])
    with pytest.raises(ValueError, match="slope > 1"):
        power_law_path(rng, 10, 1.0, 5.0, 1.0)
