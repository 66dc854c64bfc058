"""Correlation kernel against a plain NumPy loop; run as ``python bench_correlation.py``.

One thread, 120 + 40 irregular epochs, 241 lags, both directions. Prints the time of one
correlation, of one whole recovery with 100 resamples, and of drawing one pair of light curves.
"""

import time

import numpy as np

from planner.kernels.correlation import correlate
from planner.lightcurves import draw_pair
from planner.recovery import recover_lag


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


def best_of(call, repeats, rounds=7):
    """Shortest mean time of a call, in seconds."""
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        for _ in range(repeats):
            call()
        times.append((time.perf_counter() - start) / repeats)
    return min(times)


def random_campaign(rng, lags):
    t1, t2 = np.sort(rng.uniform(0, 120, 120)), np.sort(rng.uniform(0, 120, 40))
    f1, f2 = draw_pair(rng, t1, t2, 60.0, 12.0, 8.0)
    return t1, f1, t2, f2, lags, 5


def main():
    rng = np.random.default_rng(1)
    lags = np.linspace(-40.0, 80.0, 241)
    start = time.perf_counter()
    t1, f1, t2, f2, _, _ = random_campaign(rng, lags)
    print(f"first call, light curves    {time.perf_counter() - start:8.2f} s")
    start = time.perf_counter()
    recover_lag(t1, f1, 0.1, t2, f2, 0.1, lags, 2, rng)
    print(f"first call, recovery        {time.perf_counter() - start:8.2f} s")

    # many different curves: on one and the same, the processor learns the branches by heart
    campaigns = [random_campaign(rng, lags) for _ in range(50)]
    difference = max(np.nanmax(np.abs(correlate(*c) - plain_correlation(*c))) for c in campaigns)
    kernel = best_of(lambda: [correlate(*c) for c in campaigns], 3) / len(campaigns)
    plain = best_of(lambda: [plain_correlation(*c) for c in campaigns[:5]], 1) / 5
    print(f"one correlation             {1e3 * kernel:8.3f} ms")
    print(f"the same as a NumPy loop    {1e3 * plain:8.3f} ms")
    print(f"ratio                       {plain / kernel:8.0f}")
    print(f"largest difference          {difference:8.1e}")

    whole = best_of(lambda: recover_lag(t1, f1, 0.1, t2, f2, 0.1, lags, 100, rng), 5)
    print(f"recovery, 100 resamples     {1e3 * whole:8.2f} ms")
    many, some = np.sort(rng.uniform(0, 1000, 1800)), np.sort(rng.uniform(0, 1000, 300))
    pair = best_of(lambda: draw_pair(rng, many, some, 60.0, 12.0, 8.0), 50)
    print(f"pair of 1800 + 300 epochs   {1e3 * pair:8.3f} ms")


if __name__ == "__main__":
    main()
