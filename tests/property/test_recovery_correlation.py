"""The correlation kernel against a plain NumPy twin, and what must not change its answer."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.kernels.correlation import resampled_centroids
from planner.recovery import centroid, correlation


def averaged(t, f):
    """Sorted in time, epochs at one time averaged."""
    times = sorted(set(t.tolist()))
    return np.array(times), np.array([f[t == time].mean() for time in times])


def one_way(t_at, f_at, t_of, f_of, shift, min_points):
    """r of `at` with `of` interpolated at t_at + shift, or NaN."""
    if t_of.size < 2:
        return np.nan
    when = t_at + shift
    inside = (when >= t_of[0]) & (when <= t_of[-1])
    if inside.sum() < max(min_points, 2):
        return np.nan
    x, y = np.interp(when[inside], t_of, f_of), f_at[inside]
    if x.std() <= 1e-5 * f_of.std() or y.std() <= 1e-5 * f_at.std():
        return np.nan
    dx, dy = x - x.mean(), y - y.mean()
    return (dx * dy).mean() / np.sqrt((dx**2).mean() * (dy**2).mean())


def plain_correlation(t1, f1, t2, f2, lags, min_points):
    (t1, f1), (t2, f2) = averaged(t1, f1), averaged(t2, f2)
    forth = [one_way(t2, f2, t1, f1, -lag, min_points) for lag in lags]
    back = [one_way(t1, f1, t2, f2, lag, min_points) for lag in lags]
    return (np.array(forth) + np.array(back)) / 2


def plain_centroid(lags, r):
    if np.all(np.isnan(r)):
        return np.nan
    top = int(np.nanargmax(r))
    ends = r[[max(top - 1, 0), min(top + 1, r.size - 1)]]
    if top in (0, r.size - 1) or np.any(np.isnan(ends)) or r[top] <= 0:
        return np.nan
    high = r >= 0.8 * r[top]
    lo = max((k for k in range(top) if not high[k]), default=-1)
    hi = min((k for k in range(top, r.size) if not high[k]), default=r.size)
    return np.average(lags[lo + 1 : hi], weights=r[lo + 1 : hi])


def random_curves(rng, n1, n2, span=100.0):
    """Irregular epochs, with a gap, and smooth curves with noise and a delay of 7."""
    t1, t2 = rng.uniform(0.0, span, n1), rng.uniform(0.0, span, n2)
    t1 = np.where((t1 > 0.4 * span) & (t1 < 0.6 * span), t1 / 2, t1)
    f1 = np.sin(t1 / 8) + 0.3 * np.sin(t1 / 3) + 0.1 * rng.normal(size=n1)
    f2 = np.sin((t2 - 7) / 8) + 0.3 * np.sin((t2 - 7) / 3) + 0.1 * rng.normal(size=n2)
    return t1, f1, t2, f2


# eighths of a day: sums and differences are exact, so that both sides agree on what overlaps
eighths = st.integers(-400, 400).map(lambda n: n / 8)
curve = st.lists(st.tuples(eighths, eighths), min_size=0, max_size=25).map(
    lambda rows: np.array(rows, dtype=float).reshape(-1, 2)
)
grids = st.tuples(st.integers(-300, 0), st.integers(1, 40), st.integers(1, 60)).map(
    lambda g: (g[0] + g[1] * np.arange(g[2])) / 8
)


@settings(max_examples=150, deadline=None, derandomize=True)
@given(curve, curve, grids, st.integers(2, 8))
def test_kernel_equals_the_plain_twin_on_any_data(one, two, lags, min_points):
    data = (one[:, 0], one[:, 1], two[:, 0], two[:, 1], lags, min_points)
    np.testing.assert_allclose(correlation(*data), plain_correlation(*data), rtol=0, atol=1e-10)


@pytest.mark.parametrize(
    ("n1", "n2"), [(120, 40), (40, 120), (30, 30), (300, 12), (2, 50), (50, 2), (3, 9)]
)
def test_kernel_equals_the_plain_twin_on_irregular_data(n1, n2):
    lags = np.linspace(-40.0, 80.0, 241)
    t1, f1, t2, f2 = random_curves(np.random.default_rng([n1, n2]), n1, n2)
    ties = n1 // 5
    t1[:ties] = t1[n1 - ties :]
    f1, f2 = f1 + 1000.0, 1e-6 * f2
    expected = plain_correlation(t1, f1, t2, f2, lags, 2)
    assert np.isfinite(expected).any()
    np.testing.assert_allclose(correlation(t1, f1, t2, f2, lags, 2), expected, rtol=0, atol=1e-10)


@pytest.mark.parametrize("quiet", [1e-1, 1e-2, 1e-3])
def test_kernel_keeps_its_digits_where_a_violent_curve_is_quiet(quiet):
    """The points that overlap vary little about a level far from the mean of the whole curve."""
    rng = np.random.default_rng(12)
    t1, t2 = np.sort(rng.uniform(0.0, 100.0, 60)), np.sort(rng.uniform(0.0, 100.0, 50))
    f1, f2 = (np.where(t < 50.0, 20.0 * np.sin(t), 50.0 + quiet * np.sin(t / 5)) for t in (t1, t2))
    lags = np.linspace(-80.0, 80.0, 161)
    expected = plain_correlation(t1, f1, t2, f2, lags, 3)
    assert np.isfinite(expected).sum() > 140
    np.testing.assert_allclose(correlation(t1, f1, t2, f2, lags, 3), expected, rtol=0, atol=1e-10)


def test_kernel_equals_the_plain_twin_on_two_points_each():
    t1, f1, t2 = np.array([1.0, 9.0]), np.array([3.0, 1.0]), np.array([4.0, 12.0])
    lags = np.arange(-8.0, 9.0)
    for f2 in (np.array([0.0, 5.0]), np.array([5.0, 0.0])):
        expected = plain_correlation(t1, f1, t2, f2, lags, 2)
        assert np.isfinite(expected).tolist() == (lags == 3.0).tolist()
        np.testing.assert_allclose(correlation(t1, f1, t2, f2, lags, 2), expected, atol=1e-10)


def test_resampling_equals_the_plain_twin():
    rng = np.random.default_rng(8)
    t1, f1, t2, f2 = random_curves(rng, 40, 20)
    (t1, f1), (t2, f2) = averaged(t1, f1), averaged(t2, f2)
    e1, e2 = rng.uniform(0.1, 0.3, t1.size), rng.uniform(0.1, 0.3, t2.size)
    lags, b = np.linspace(-20.0, 40.0, 41), 8
    picks1, picks2 = rng.integers(0, t1.size, (b, t1.size)), rng.integers(0, t2.size, (b, t2.size))
    normals1, normals2 = rng.standard_normal((b, t1.size)), rng.standard_normal((b, t2.size))
    expected = []
    for p1, z1, p2, z2 in zip(picks1, normals1, picks2, normals2, strict=True):
        (k1, c1), (k2, c2) = np.unique(p1, return_counts=True), np.unique(p2, return_counts=True)
        drawn1 = f1[k1] + e1[k1] / np.sqrt(c1) * z1[k1]
        drawn2 = f2[k2] + e2[k2] / np.sqrt(c2) * z2[k2]
        r = plain_correlation(t1[k1], drawn1, t2[k2], drawn2, lags, 4)
        expected.append(plain_centroid(lags, r))
    found = resampled_centroids(
        t1, f1, e1, t2, f2, e2, lags, 4, 0.8, picks1, normals1, picks2, normals2
    )
    assert np.isfinite(expected).sum() >= 4
    np.testing.assert_allclose(found, expected, rtol=0, atol=1e-10)


lags_even = np.arange(-40, 41) / 2


@pytest.fixture
def curves():
    t1, f1, t2, f2 = random_curves(np.random.default_rng(5), 70, 35)
    return np.round(8 * t1) / 8, f1, np.round(8 * t2) / 8, f2


@pytest.mark.parametrize("shift", [-37.5, 1024.0, 61234.125])
def test_moving_both_curves_in_time_changes_nothing(curves, shift):
    t1, f1, t2, f2 = curves
    np.testing.assert_allclose(
        correlation(t1 + shift, f1, t2 + shift, f2, lags_even),
        correlation(t1, f1, t2, f2, lags_even),
        atol=1e-12,
    )


@pytest.mark.parametrize("delay", [-5.0, 3.5, 7.0])
def test_delaying_the_line_moves_the_lag(curves, delay):
    t1, f1, t2, f2 = curves
    before = correlation(t1, f1, t2, f2, lags_even)
    after = correlation(t1, f1, t2 + delay, f2, lags_even + delay)
    np.testing.assert_allclose(after, before, atol=1e-12)
    fixed_grid = centroid(lags_even, correlation(t1, f1, t2 + delay, f2, lags_even))[0]
    assert fixed_grid == pytest.approx(centroid(lags_even, before)[0] + delay, abs=1e-9)


@pytest.mark.parametrize(("scale", "offset"), [(3.0, 0.0), (1.0, 100.0), (1e-15, 2e-14)])
def test_scale_and_zero_point_of_the_flux_change_nothing(curves, scale, offset):
    t1, f1, t2, f2 = curves
    before = correlation(t1, f1, t2, f2, lags_even)
    np.testing.assert_allclose(
        correlation(t1, scale * f1 + offset, t2, f2, lags_even), before, atol=1e-11
    )
    np.testing.assert_allclose(
        correlation(t1, f1, t2, scale * f2 + offset, lags_even), before, atol=1e-11
    )


def test_swapping_the_curves_changes_the_sign_of_the_lag(curves):
    t1, f1, t2, f2 = curves
    forth = correlation(t1, f1, t2, f2, lags_even)
    back = correlation(t2, f2, t1, f1, lags_even)
    np.testing.assert_allclose(back[::-1], forth, atol=1e-12)
    assert centroid(lags_even, back)[0] == pytest.approx(-centroid(lags_even, forth)[0], abs=1e-9)


def test_order_of_the_epochs_changes_nothing(curves):
    t1, f1, t2, f2 = curves
    mixed1, mixed2 = (
        np.random.default_rng(1).permutation(70),
        np.random.default_rng(2).permutation(35),
    )
    np.testing.assert_allclose(
        correlation(t1[mixed1], f1[mixed1], t2[mixed2], f2[mixed2], lags_even),
        correlation(t1, f1, t2, f2, lags_even),
        atol=1e-12,
    )
