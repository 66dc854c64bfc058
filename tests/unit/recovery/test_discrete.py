import numpy as np
import pytest

from planner.kernels.discrete_correlation import binned_pairs
from planner.lightcurves import draw_pair
from planner.recovery.discrete import discrete_correlation, discrete_lag


def light_curves(seed=0, n=70, m=40, lag=10.0, noise=0.1):
    rng = np.random.default_rng(seed)
    t1, t2 = np.sort(rng.uniform(0, 100, n)), np.sort(rng.uniform(0, 100, m))
    x, y = draw_pair(rng, t1, t2, 20.0, lag, 4.0)
    return (
        t1,
        x + noise * rng.standard_normal(n),
        noise,
        t2,
        y + noise * rng.standard_normal(m),
        noise,
    )


def plain_bins(lag, first, second, f1, f2, population):
    """Twin of the kernel: lists and NumPy's correlation."""
    rows, held = [], []
    for p in range(lag.size):
        if first[p] in {first[q] for q in held} or second[p] in {second[q] for q in held}:
            continue
        held.append(p)
        if len(held) == population:
            a, b = f1[first[held]], f2[second[held]]
            flat = a.std() == 0 or b.std() == 0
            rows.append((lag[held].mean(), np.nan if flat else np.corrcoef(a, b)[0, 1]))
            held = []
    return np.array(rows).reshape(-1, 2).T


@pytest.mark.parametrize("population", [5, 11, 30])
def test_bins_agree_with_the_plain_loop(population):
    t1, f1, _, t2, f2, _ = light_curves()
    f1[:40] = 1.0
    lag = (t2 - t1[:, None]).ravel()
    order = np.argsort(lag)
    arguments = lag[order], order // 40, order % 40, f1, f2, population
    lags, r, pairs = binned_pairs(*arguments)
    expected = plain_bins(*arguments)
    assert lags == pytest.approx(expected[0])
    assert r == pytest.approx(expected[1], nan_ok=True)
    assert np.all(pairs == population)


def test_interval_is_that_of_the_z_transform():
    """r = 0.5, n = 21: z = 0.5493 + 0.5/40 (1 + 5.25/80 + 11.6875/3200) = 0.56267, variance
    (1 + 3.75/40 + 20.3125/2400) / 20 = 0.055111, by hand from the moments of Alexander (1997)."""
    rng = np.random.default_rng(1)
    a = rng.standard_normal(21)
    b = rng.standard_normal(21)
    a, b = a - a.mean(), b - b.mean()
    b -= a * (a @ b) / (a @ a)
    f2 = 0.5 * a / np.linalg.norm(a) + np.sqrt(0.75) * b / np.linalg.norm(b)
    t = np.arange(21) * 100.0
    found = discrete_correlation(t, a, 0.1, t + 3.0, f2, 0.1, 0.0, 6.0, min_pairs=21)
    assert found.lags_d == pytest.approx([3.0])
    assert found.r == pytest.approx([0.5])
    assert found.r_lo == pytest.approx([np.tanh(0.56267 - np.sqrt(0.055111))], abs=2e-5)
    assert found.r_hi == pytest.approx([np.tanh(0.56267 + np.sqrt(0.055111))], abs=2e-5)


def test_finds_the_lag_of_good_data():
    inside = 0
    for seed in range(10):
        found = discrete_lag(discrete_correlation(*light_curves(seed), -20.0, 40.0))
        assert found.lag_lo_d <= found.lag_d <= found.lag_hi_d
        assert found.lag_d == pytest.approx(10.0, abs=6.0)
        inside += found.lag_lo_d <= 10.0 <= found.lag_hi_d
    assert inside >= 4


def test_bins_hold_each_epoch_once_and_stay_in_range():
    found = discrete_correlation(*light_curves(), -20.0, 40.0)
    assert np.all(np.diff(found.lags_d) > 0)
    assert found.lags_d[0] > -20.0
    assert found.lags_d[-1] < 40.0
    assert np.all((found.r_lo < found.r) & (found.r < found.r_hi))


T = np.arange(30.0)
F = np.sin(T)
REFUSED = {
    "few": ((T[:5], F[:5], 0.1, T, F, 0.1), "fewer than 11 usable epochs"),
    "NaN": ((T, F * np.nan, 0.1, T, F, 0.1), "fewer than 11 usable epochs"),
    "one time": ((T * 0, F, 0.1, T, F, 0.1), "fewer than 11 usable epochs"),
    "constant": ((T, F * 0, 0.1, T, F, 0.1), "does not vary"),
    "apart": ((T, F, 0.1, T + 500, F, 0.1), "no bin of lags holds 11 independent pairs"),
    "opposite": ((T, F, 0.1, T + 1, -F, 0.1), "nowhere positively correlated"),
}


@pytest.mark.parametrize("name", REFUSED)
def test_data_without_a_lag_say_why(name):
    data, reason = REFUSED[name]
    limits = (0.5, 2.0) if name == "opposite" else (-10.0, 10.0)
    found = discrete_lag(discrete_correlation(*data, *limits))
    assert reason in found.reason
    assert np.isnan([found.lag_d, found.lag_lo_d, found.lag_hi_d]).all()


def test_peak_at_the_edge_is_no_lag():
    found = discrete_lag(discrete_correlation(*light_curves(), 10.0, 12.0))
    assert found.reason == "the correlation peaks at the edge of the lags that can be searched"


def test_empty_range_says_so():
    assert (
        discrete_correlation(T, F, 0.1, T, F, 0.1, 3.0, np.nan).reason
        == "the range of lags is empty"
    )
