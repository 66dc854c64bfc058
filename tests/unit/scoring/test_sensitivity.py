import numpy as np
import pytest
from scipy import stats
from scipy.special import expit

from planner.scoring.sensitivity import FEWEST_TRIALS, reweighted, sensitivities

FACTORS = ["lag", "amplitude", "timescale", "weather"]


def chance(lag, amplitude, timescale, nights):
    """Success peaks in the middle of the lags."""
    return expit(
        0.8 - 0.5 * lag - 0.8 * (lag**2 - 1) + 0.7 * amplitude - 0.3 * timescale
        + 0.06 * (nights - 55)
    )  # fmt: skip


def drawn(rng, n):
    nights = rng.binomial(90, rng.beta(8, 5, n)).astype(float)
    return (*rng.normal(size=(3, n)), nights)


def tried(seed, n, success=chance):
    rng = np.random.default_rng(seed)
    factors = drawn(rng, n)
    return rng.random(n) < success(*factors), *factors


def held(factor, value, success=chance, n=100_000):
    """Success with one factor held, from the draws of the others: the truth."""
    factors = list(drawn(np.random.default_rng(99), n))
    factors[FACTORS.index(factor)] = np.full(n, value)
    return success(*factors).mean()


def test_three_levels_of_each_factor_are_near_the_truth():
    found = sensitivities(*tried(1, 20_000))
    assert [(s.factor, s.level) for s in found] == [
        ("lag", "short"), ("lag", "median"), ("lag", "long"),
        ("amplitude", "small"), ("amplitude", "median"), ("amplitude", "large"),
        ("timescale", "short"), ("timescale", "median"), ("timescale", "long"),
        ("weather", "bad"), ("weather", "median"), ("weather", "good"),
    ]  # fmt: skip
    for s in found:
        assert s.success == pytest.approx(held(s.factor, s.value), abs=0.02)
        assert 0 < s.success_lo < s.success < s.success_hi < 1


def test_values_are_percentiles():
    success, lag, amplitude, timescale, nights = tried(2, 500)
    found = sensitivities(success, lag, amplitude, timescale, nights)
    for first in (0, 3, 6):
        assert [s.value for s in found[first : first + 3]] == pytest.approx(
            stats.norm.ppf([0.1, 0.5, 0.9]), abs=1e-12
        )
    assert [s.value for s in found[9:]] == pytest.approx(np.percentile(nights, [10, 50, 90]))


def test_the_units_of_the_weather_do_not_matter():
    success, *factors, nights = tried(3, 100)
    nightly = sensitivities(success, *factors, nights)
    hourly = sensitivities(success, *factors, 8 * nights)
    assert [s.success for s in hourly] == pytest.approx([s.success for s in nightly])


@pytest.mark.parametrize("value", [True, False])
def test_outcomes_all_alike_give_intervals_like_those_of_a_share(value):
    _, *factors = tried(4, 60)
    found = sensitivities(np.full(60, value), *factors)
    assert len(found) == 12
    for s in found:
        assert 0 < s.success_lo < s.success < s.success_hi < 1
        far = s.success_lo if value else 1 - s.success_hi
        near = s.success if value else 1 - s.success
        assert near > 0.95
        assert 0.7 < far < 0.99


def test_weather_that_never_changed_is_left_out():
    success, *factors, _ = tried(5, 100)
    found = sensitivities(success, *factors, np.full(100, 30.0))
    assert [s.factor for s in found] == sorted(FACTORS[:3] * 3, key=FACTORS.index)


def test_few_trials_say_nothing():
    few = FEWEST_TRIALS - 1
    assert sensitivities(*(a[:few] for a in tried(6, 60))) == ()
    assert len(sensitivities(*(a[: few + 1] for a in tried(6, 60)))) == 12


@pytest.mark.slow
@pytest.mark.statistical
@pytest.mark.parametrize("n", [60, 200])
def test_nine_intervals_of_ten_hold_the_truth(n):
    """300 layouts of n trials. A coverage of 0.9 has an error of 0.017 from 300 cases."""
    truth, inside = {}, {}
    for seed in range(300):
        for s in sensitivities(*tried((7, seed), n)):
            key = s.factor, s.value
            if key not in truth:
                truth[key] = held(*key, n=20_000)
            good = s.success_lo <= truth[key] <= s.success_hi
            inside.setdefault((s.factor, s.level), []).append(good)
    for level, hits in inside.items():
        assert 0.85 <= np.mean(hits) <= 0.95, level
    assert 0.88 <= np.mean(list(inside.values())) <= 0.92


# Another prior of the lag

SCATTER = 0.2


def peaked(lag_z):
    return expit(1.2 - 0.6 * lag_z - 0.7 * lag_z**2)


def with_prior(shift, scatter):
    """Success drawn straight from the new prior."""
    z = (shift + scatter * np.random.default_rng(3).normal(size=400_000)) / SCATTER
    return peaked(z).mean()


@pytest.mark.parametrize(
    ("shift", "scatter"), [(0.0, 0.2), (0.1, 0.2), (-0.15, 0.2), (0.0, 0.1), (0.05, 0.24)]
)
def test_weighted_trials_agree_with_direct_simulation(shift, scatter):
    """From 100 000 trials; the tolerance is four times the error of those that count."""
    rng = np.random.default_rng(5)
    z = rng.normal(size=100_000)
    share, lo, hi, count = reweighted(rng.random(z.size) < peaked(z), z, shift, SCATTER, scatter)
    truth = with_prior(shift, scatter)
    assert share == pytest.approx(truth, abs=4 * np.sqrt(truth * (1 - truth) / count))
    assert lo < share < hi
    assert hi - lo < 0.02


@pytest.mark.parametrize(("shift", "scatter"), [(0.1, 0.2), (0.0, 0.1), (0.0, 0.25)])
def test_the_interval_holds_the_truth(shift, scatter):
    rng = np.random.default_rng(6)
    truth, inside = with_prior(shift, scatter), []
    for _ in range(400):
        z = rng.normal(size=200)
        _, lo, hi, _ = reweighted(rng.random(200) < peaked(z), z, shift, SCATTER, scatter)
        inside.append(lo <= truth <= hi)
    assert 0.85 <= np.mean(inside) <= 0.97


def test_the_same_prior_changes_nothing():
    z = np.random.default_rng(7).normal(size=50)
    success = z > 0.2
    share, lo, hi, count = reweighted(success, z, 0.0, 0.0, 0.0)
    assert (share, count) == (success.mean(), 50)
    interval = stats.binomtest(int(success.sum()), 50).proportion_ci(0.9, method="wilson")
    assert (lo, hi) == pytest.approx((interval.low, interval.high))


def test_the_count_is_kish_s_or_what_it_tends_to():
    """For equal scatters the mean squared weight is exp((shift / scatter)^2), by hand."""
    z = np.random.default_rng(8).normal(size=400_000)
    *_, count = reweighted(z > 0, z, 0.1, 0.2, 0.2)
    assert count == pytest.approx(z.size * np.exp(-0.25), rel=0.01)
    *_, narrow = reweighted(z > 0, z, 0.0, 0.2, 0.1)
    weights = stats.norm.pdf(z, scale=0.5) / stats.norm.pdf(z)
    assert narrow == pytest.approx(weights.sum() ** 2 / np.sum(weights**2), rel=0.01)


@pytest.mark.parametrize(
    ("n", "shift", "scatter", "new"),
    [
        (200, 0.6, 0.2, 0.2),
        (200, 0.0, 0.2, 0.3),
        (200, 0.0, 0.2, 0.0),
        (200, 0.1, 0.0, 0.0),
        (14, 0.0, 0.2, 0.2),
        (0, 0.1, 0.2, 0.2),
    ],
)
def test_too_little_overlap_gives_no_answer(n, shift, scatter, new):
    z = np.random.default_rng(9).normal(size=n)
    *numbers, count = reweighted(z > 0, z, shift, scatter, new)
    assert np.all(np.isnan(numbers))
    assert count < max(15, n / 10)


def test_what_is_no_prior_is_refused():
    z = np.zeros(30)
    with pytest.raises(ValueError, match="negative"):
        reweighted(z > 0, z, 0.0, -0.1, 0.2)
    with pytest.raises(ValueError, match="finite"):
        reweighted(z > 0, z, np.nan, 0.1, 0.2)
