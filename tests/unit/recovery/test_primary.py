"""The primary peak: weights against aliases, shares, errors from one peak only."""

import numpy as np
import pytest

from planner.recovery import joined, recover_lag
from planner.recovery.curve import tidy_pair
from planner.recovery.primary import median_step, overlap_weight, primary_peak

LAGS = np.arange(-50.0, 250.5, 0.5)


def test_weight_is_the_square_of_the_overlapping_share():
    t = np.arange(0.0, 100.0)
    weight = overlap_weight(t, t, np.array([-50.0, 0.0, 25.0, 99.0, 130.0]))
    np.testing.assert_allclose(weight, [0.25, 1.0, 0.5625, 1e-4, 0.0])


def test_lags_that_shift_a_season_under_a_gap_weigh_little():
    """Two seasons of 180 d with a gap of 185: shifted by half a year nothing overlaps."""
    season = np.arange(0.0, 180.0, 2.0)
    t = np.concatenate([season, season + 365.0])
    weight = overlap_weight(t, t, np.array([0.0, 30.0, 182.0, 365.0]))
    assert weight[0] == 1.0
    assert weight[1] == pytest.approx((1 - 30 / 180) ** 2, abs=0.03)
    assert weight[2] == pytest.approx(0.0, abs=1e-3)
    assert weight[3] == pytest.approx(0.25, abs=0.01)


def test_weight_equals_a_plain_count_of_covered_epochs():
    rng = np.random.default_rng(21)
    t1 = np.unique(np.concatenate([rng.integers(0, 300, 80), rng.integers(600, 900, 80)])) / 2
    t2 = np.unique(rng.integers(0, 900, 60)) / 2
    gap = np.flatnonzero(np.diff(t1) > 10 * np.median(np.diff(t1)))
    seasons = np.split(t1, gap + 1)
    assert len(seasons) == 2

    def covered(lag):
        return sum(any(s[0] <= t - lag <= s[-1] for s in seasons) for t in t2)

    expected = [min(covered(lag) / covered(0.0), 1.0) ** 2 for lag in LAGS]
    np.testing.assert_allclose(overlap_weight(t1, t2, LAGS), expected)


@pytest.mark.parametrize("count", [2, 3, 8, 9])
def test_median_step_is_the_median_of_the_steps(count):
    t = np.cumsum(np.random.default_rng(count).uniform(0.1, 3.0, count))
    assert median_step(t) == np.median(np.diff(t))


def test_primary_peak_equals_a_plain_search_from_valley_to_valley():
    rng = np.random.default_rng(33)
    for _ in range(30):
        middles = rng.uniform(-40, 240, 3)
        found = np.clip(rng.choice(middles, 40) + rng.normal(0, 6, 40), LAGS[0], LAGS[-1])
        weight = rng.uniform(0.2, 1.0) * np.ones(LAGS.size)
        weight[LAGS > 100] *= 0.5
        density = np.zeros(LAGS.size)
        for lag in found:
            density += np.interp(lag, LAGS, weight) * np.exp(-0.5 * ((LAGS - lag) / 10.0) ** 2)
        top = int(np.argmax(density))
        a = top
        while a > 0 and density[a - 1] < density[a]:
            a -= 1
        b = top
        while b < LAGS.size - 1 and density[b + 1] < density[b]:
            b += 1
        outside = [d for k, d in enumerate(density) if not a <= k <= b]
        peak = primary_peak(LAGS, found, weight, 400.0)
        assert (peak.lo_d, peak.hi_d) == (LAGS[a], LAGS[b])
        assert peak.share == np.mean((found >= LAGS[a]) & (found <= LAGS[b]))
        assert peak.rival == pytest.approx(max(outside, default=0.0) / density[top], abs=1e-6)


def test_the_weight_decides_between_peaks_and_shares_are_unweighted():
    rng = np.random.default_rng(1)
    found = np.concatenate([rng.normal(30, 3, 400), rng.normal(180, 3, 600)])
    taller = primary_peak(LAGS, found, np.ones(LAGS.size), 400.0)
    assert taller.lo_d < 180 < taller.hi_d
    weight = np.where(LAGS > 100, 0.1, 1.0)
    chosen = primary_peak(LAGS, found, weight, 400.0)
    assert chosen.lo_d < 30 < chosen.hi_d < 180
    assert chosen.share == pytest.approx(0.4)
    ((lag, share),) = chosen.others
    assert lag == pytest.approx(180, abs=2)
    assert share == pytest.approx(0.6)


def test_lags_without_any_weight_still_give_a_peak():
    peak = primary_peak(LAGS, np.full(9, 200.0), np.zeros(LAGS.size), 400.0)
    assert peak.lo_d < 200 < peak.hi_d
    assert (peak.share, peak.others) == (1.0, ())


def test_errors_come_from_the_primary_peak_alone():
    """A periodic signal has aliases one period away; the interval does not span them."""
    t = np.arange(0.0, 120.0, 1.5)
    signal = np.sin(2 * np.pi * t / 30) + 0.1 * np.sin(2 * np.pi * t / 71)
    late = np.sin(2 * np.pi * (t - 8) / 30) + 0.1 * np.sin(2 * np.pi * (t - 8) / 71)
    rng = np.random.default_rng(3)
    result = recover_lag(t, signal, 0.5, t, late, 0.5, np.arange(-40.0, 60.5, 0.5), 300, rng)
    assert result.aliases
    assert result.in_peak < 1.0
    assert result.lag_d == pytest.approx(8.0, abs=1.5)
    assert result.lag_hi_d - result.lag_lo_d < 6.0
    assert np.ptp(np.percentile(result.centroids_d, [2, 98])) > 25.0


def test_a_straight_line_is_taken_off():
    t = np.linspace(0.0, 90.0, 46)
    wave, late = np.sin(t / 6), np.sin((t - 9) / 6)
    lags = np.arange(-30.0, 30.5, 0.5)
    steep = 0.08
    options = {"lags_d": lags, "resamples": 20, "rng": np.random.default_rng(5)}
    trended = recover_lag(t, wave + steep * t, 0.01, t, late - steep * t, 0.01, **options)
    assert not trended.r_max > 0.5
    cleaned = recover_lag(
        t, wave + steep * t, 0.01, t, late - steep * t, 0.01, **options, detrend=True
    )
    assert cleaned.lag_d == pytest.approx(9.0, abs=0.7)
    one, _ = tidy_pair(t, 3 + 2 * t, 0.1, t, t, 0.0)
    np.testing.assert_allclose(one.without_trend().flux, 0.0, atol=1e-9)


def test_joined_curves_come_to_the_scale_of_the_first():
    t = np.arange(0.0, 100.0, 2.0)
    flux = 1 + 0.2 * np.sin(t / 9)
    other = t + 1.0
    measured = 0.3 + 1.4 * (1 + 0.2 * np.sin(other / 9))
    error = np.full(t.size, 0.002)
    all_t, all_flux, all_error = joined([(t, flux, error), (other, measured, 1.4 * error)])
    assert (np.diff(all_t) > 0).all()
    np.testing.assert_allclose(all_flux, 1 + 0.2 * np.sin(all_t / 9), atol=0.01)
    np.testing.assert_allclose(all_error, 0.002, rtol=0.02)


@pytest.mark.parametrize("count", [0, 1, 3])
def test_too_few_common_epochs_only_align_the_means(count):
    t = np.arange(0.0, 40.0)
    other = t[:count] + 0.5
    rows = (other, np.full(count, 7.0), np.full(count, 0.1))
    all_t, flux, _ = joined([(t, np.ones(40), np.full(40, 0.1)), rows])
    assert all_t.size == 40 + count
    np.testing.assert_allclose(flux, 1.0)


def test_an_empty_first_curve_leaves_the_others():
    nothing = (np.empty(0),) * 3
    rows = (np.arange(5.0), np.arange(5.0), np.ones(5))
    np.testing.assert_array_equal(joined([nothing, rows])[1], np.arange(5.0))
    assert joined([nothing, nothing])[0].size == 0
