import numpy as np
import pytest

from planner.lightcurves import draw_pair
from planner.recovery import lag_grid, peak_correlation, recover_lag, search_range
from planner.recovery.lag import BATCH, peak_correlations

LAGS = np.arange(-10.0, 20.5, 0.5)
FEW = "the light curves overlap in too few points, or do not vary, at every lag searched"
EDGE = "the correlation peaks at the edge of the lags that can be searched"


def pair(lag=6.0, n=40):
    t = np.linspace(0.0, 80.0, n)
    return (
        t,
        np.sin(t / 8) + 0.5 * np.sin(t / 3.1),
        np.sin((t - lag) / 8) + 0.5 * np.sin((t - lag) / 3.1),
    )


def recover(t1, f1, e1, t2, f2, e2, lags=LAGS, resamples=8, seed=1, **options):
    rng = np.random.default_rng(seed)
    return recover_lag(t1, f1, e1, t2, f2, e2, lags, resamples, rng, **options)


def test_known_delay_is_found_with_its_interval():
    t, f1, f2 = pair()
    result = recover(t, f1, 0.02, t, f2, 0.02, resamples=24)
    assert result.reason == ""
    assert result.lag_d == pytest.approx(6.0, abs=0.5)
    assert result.lag_lo_d < result.lag_d < result.lag_hi_d
    assert result.peak_d == pytest.approx(6.0, abs=0.5)
    assert result.centroid_d == pytest.approx(6.0, abs=0.5)
    assert 0.95 < result.r_max <= 1.0
    assert result.share == 1.0
    assert result.centroids_d.shape == (24,)
    assert result.r.shape == result.lags_d.shape == LAGS.shape
    np.testing.assert_allclose(
        [result.lag_lo_d, result.lag_d, result.lag_hi_d],
        np.percentile(result.centroids_d, [15.87, 50.0, 84.13]),
    )


def test_same_stream_gives_the_same_lag_and_another_does_not():
    t, f1, f2 = pair()
    first, again, other = (recover(t, f1, 0.1, t, f2, 0.1, seed=s) for s in (3, 3, 4))
    np.testing.assert_array_equal(first.centroids_d, again.centroids_d)
    assert not np.array_equal(first.centroids_d, other.centroids_d)


def test_larger_flux_errors_widen_the_interval():
    t, f1, f2 = pair()
    results = [recover(t, f1, e, t, f2, e, resamples=30) for e in (0.01, 0.4)]
    width = [r.lag_hi_d - r.lag_lo_d for r in results]
    assert width[1] > 2 * width[0]


def test_zero_errors_leave_the_scatter_of_the_subsets():
    t, f1, f2 = pair()
    result = recover(t, f1, 0.0, t, f2, 0.0)
    assert result.lag_d == pytest.approx(6.0, abs=0.5)
    assert np.ptp(result.centroids_d) > 0.0


def test_unsorted_times_and_unusable_epochs_are_no_obstacle():
    t, f1, f2 = pair()
    plain = recover(t, f1, 0.02, t, f2, 0.02)
    mixed = np.random.default_rng(0).permutation(t.size)
    t_more, f_more = np.append(t[mixed], [3.3, np.nan]), np.append(f1[mixed], [np.nan, 1.0])
    other = recover(t_more, f_more, 0.02, t, f2, 0.02)
    np.testing.assert_array_equal(other.centroids_d, plain.centroids_d)


@pytest.mark.parametrize(
    ("t1", "f1", "t2", "f2"),
    [
        ([], [], [], []),
        ([1.0], [1.0], [2.0], [1.0]),
        ([1.0, 9.0], [1.0, 2.0], [2.0, 8.0], [1.0, 2.0]),
        (np.full(9, 4.0), np.arange(9.0), np.full(9, 4.0), np.arange(9.0)),
        (np.arange(30.0), np.ones(30), np.arange(30.0), np.arange(30.0)),
        (np.arange(30.0), np.arange(30.0), np.arange(30.0), np.full(30, 0.1)),
        (np.arange(30.0), np.arange(30.0), np.arange(500.0, 530.0), np.arange(30.0)),
        (np.arange(30.0), np.full(30, np.nan), np.arange(30.0), np.arange(30.0)),
    ],
    ids=["empty", "one", "two", "one time", "flat", "flat line", "apart", "nan"],
)
def test_data_without_a_correlation_give_a_reason(t1, f1, t2, f2):
    result = recover(t1, f1, 0.1, t2, f2, 0.1)
    assert result.reason == FEW
    assert np.all(np.isnan([result.lag_d, result.lag_lo_d, result.lag_hi_d, result.r_max]))
    assert np.all(np.isnan(result.r))
    assert (result.share, result.centroids_d.size) == (0.0, 0)


def test_two_points_are_enough_if_the_caller_says_so():
    t, f = np.array([0.0, 40.0]), np.array([1.0, 2.0])
    assert np.nanmax(recover(t, f, 0.1, t, f, 0.1, min_points=2).r) == pytest.approx(1.0)


def test_peak_at_the_edge_is_no_lag_and_draws_nothing():
    t, f1, f2 = pair(lag=6.0)
    rng = np.random.default_rng(9)
    before = rng.bit_generator.state
    result = recover_lag(t, f1, 0.02, t, f2, 0.02, np.arange(-10.0, 4.0), 8, rng)
    assert result.reason == EDGE
    assert np.isnan(result.lag_d)
    assert result.peak_d == 3.0
    assert rng.bit_generator.state == before


def test_anticorrelated_curves_give_a_reason():
    t = np.arange(30.0)
    result = recover(t, t, 0.1, t, -t, 0.1)
    assert result.reason == "the light curves are nowhere positively correlated"


def test_lag_that_most_subsets_lose_is_no_lag():
    """Six epochs and five needed: a random subset rarely keeps enough of them."""
    t, f1, _ = pair()
    t2 = np.linspace(10.0, 70.0, 6)
    f2 = np.sin((t2 - 6) / 8) + 0.5 * np.sin((t2 - 6) / 3.1)
    result = recover(t, f1, 0.01, t2, f2, 0.01, resamples=40)
    assert result.share < 0.5
    assert (
        result.reason == f"only {100 * result.share:.0f} % of the resampled light curves gave a lag"
    )
    assert np.isnan(result.lag_d)
    assert np.isfinite(result.centroid_d)


def test_no_resamples_give_no_lag():
    t, f1, f2 = pair()
    assert np.isnan(recover(t, f1, 0.02, t, f2, 0.02, resamples=0).lag_d)


@pytest.mark.slow
@pytest.mark.statistical
def test_good_campaigns_recover_the_lag_and_the_interval_is_not_too_short():
    """Long, dense, low-noise data: the correlation method is known to work (and its resampled
    errors to be generous: Peterson et al. 1998), so the truth lies in the 68 % interval at least
    as often as that, less three binomial standard errors."""
    rng = np.random.default_rng(314)
    trials, lag, held, ratios = 100, 15.0, 0, []
    t1, t2 = np.arange(0.0, 240.0), np.arange(0.0, 240.0, 3.0)
    lags = lag_grid(*search_range(240.0, 4 * lag, 60.0), 1.0)
    for _ in range(trials):
        x, y = draw_pair(rng, t1, t2, 60.0, lag, 10.0)
        f1, f2 = x + 0.05 * rng.normal(size=x.size), y + 0.05 * rng.normal(size=y.size)
        result = recover_lag(t1, f1, 0.05, t2, f2, 0.05, lags, 60, rng)
        ratios.append(result.lag_d / lag)
        held += result.lag_lo_d <= lag <= result.lag_hi_d
    assert np.isfinite(ratios).sum() >= 98
    assert np.nanmedian(ratios) == pytest.approx(1.0, abs=0.05)
    assert np.mean(np.abs(np.array(ratios) - 1.0) < 0.3) > 0.9
    assert held / trials > 0.68 - 3 * np.sqrt(0.68 * 0.32 / trials)


@pytest.mark.parametrize("lags", [[0.0, 1.0, 3.0], [2.0, 1.0, 0.0], [1.0, 1.0, 1.0], [0.0, np.nan]])
def test_uneven_trial_lags_are_refused(lags):
    t, f1, f2 = pair()
    with pytest.raises(ValueError, match="trial lags must be ascending and evenly spaced"):
        recover(t, f1, 0.02, t, f2, 0.02, lags=lags)


def test_too_short_a_search_gives_a_reason():
    t, f1, f2 = pair()
    assert recover(t, f1, 0.02, t, f2, 0.02, lags=[6.0]).reason == EDGE
    assert recover(t, f1, 0.02, t, f2, 0.02, lags=[]).reason == FEW


@pytest.mark.slow
@pytest.mark.statistical
def test_a_search_as_wide_as_the_correlation_function_does_not_bias_the_lag():
    """A search that ended at the edge of the lag's prior made a quarter of the claims wrong: the
    stretch above 0.8 r_max was cut on one side and the centroid dragged inwards."""
    rng = np.random.default_rng(2718)
    lag, tau, ratios = 9.0, 150.0, []
    t1, t2 = np.arange(0.0, 180.0), np.arange(0.0, 180.0, 3.0)
    lags = lag_grid(*search_range(180.0, 1.8 * lag, tau), 1.0)
    for _ in range(60):
        x, y = draw_pair(rng, t1, t2, tau, lag, lag)
        f1, f2 = x + 0.05 * rng.normal(size=x.size), y + 0.05 * rng.normal(size=y.size)
        ratios.append(recover_lag(t1, f1, 0.05, t2, f2, 0.05, lags, 40, rng).lag_d / lag)
    assert np.nanmedian(ratios) == pytest.approx(1.0, abs=0.06)
    assert np.mean(np.abs(np.array(ratios) - 1.0) < 0.3) > 0.85


def test_resampling_ends_when_it_is_decided_with_the_first_of_all_resamples():
    t, f1, f2 = pair()
    seen = []

    def decided(result):
        seen.append(result.drawn)
        return result.drawn >= 2 * BATCH

    whole = recover(t, f1, 0.3, t, f2, 0.3, resamples=100)
    ended = recover(t, f1, 0.3, t, f2, 0.3, resamples=100, decided=decided)
    assert (whole.drawn, ended.drawn, seen) == (100, 2 * BATCH, [BATCH, 2 * BATCH])
    assert whole.share == ended.share == 1.0
    np.testing.assert_array_equal(ended.centroids_d, whole.centroids_d[: 2 * BATCH])
    assert ended.lag_d != whole.lag_d
    alone = recover(t, f1, 0.3, t, f2, 0.3, resamples=2 * BATCH)
    assert (ended.lag_d, ended.lag_lo_d, ended.lag_hi_d) == (
        alone.lag_d, alone.lag_lo_d, alone.lag_hi_d,
    )  # fmt: skip


def test_what_is_never_decided_draws_all():
    t, f1, f2 = pair()
    whole = recover(t, f1, 0.3, t, f2, 0.3, resamples=60)
    same = recover(t, f1, 0.3, t, f2, 0.3, resamples=60, decided=lambda _: False)
    np.testing.assert_array_equal(same.centroids_d, whole.centroids_d)
    assert (same.lag_d, same.drawn) == (whole.lag_d, 60)


def test_scatter_and_rival_describe_the_primary_peak():
    t, f1, f2 = pair()
    result = recover(t, f1, 0.02, t, f2, 0.02, resamples=24)
    assert result.in_peak == 1.0
    assert result.scatter_d == pytest.approx(result.centroids_d.std())
    assert result.rival == 0.0


def test_several_lines_give_the_peaks_of_each():
    t, f1, f2 = pair()
    lines = [f2, -f2, np.roll(f2, 11), np.full(t.size, np.nan)]
    peaks = peak_correlations(t, f1, 0.1, t, lines, 0.1, LAGS, detrend=True)
    one_by_one = [peak_correlation(t, f1, 0.1, t, f, 0.1, LAGS, detrend=True) for f in lines]
    assert np.array_equal(peaks, one_by_one, equal_nan=True)
    whole = recover(t, f1, 0.1, t, f2, 0.1, resamples=0, detrend=True)
    assert peaks[0] == whole.r_max > 0.9
    assert np.isnan(peaks[3])
