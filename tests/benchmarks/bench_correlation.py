"""Correlation kernel against a plain NumPy loop; run as ``python bench_correlation.py``.

One thread, 120 + 40 irregular epochs, 241 lags, both directions. Prints the time of one
correlation, of one whole recovery with 100 resamples, of 1000 resampled correlations (goal: 250
times the plain loop's speed, aim: 600), and of drawing one pair of light curves.
"""

import time

import numpy as np

from planner.kernels.correlation import correlate, resampled_centroids
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


def plain_centroid(lags, r):
    """Centroid of the stretch above 0.8 of the peak; NaN at the edges."""
    if np.isnan(r).all():
        return np.nan
    top = int(np.nanargmax(r))
    if top in (0, r.size - 1) or np.isnan(r[[top - 1, top + 1]]).any() or r[top] <= 0:
        return np.nan
    low = ~(r >= 0.8 * r[top])
    lo = top - int(np.argmax(np.append(low[:top][::-1], True)))
    hi = top + 1 + int(np.argmax(np.append(low[top + 1 :], True)))
    return (lags[lo:hi] * r[lo:hi]).sum() / r[lo:hi].sum()


def plain_resampled(curves, lags, picks, normals, min_points):
    """Centroid of one flux-randomised random subset."""
    subsets = []
    for (t, f, e), pick, normal in zip(curves, picks, normals, strict=True):
        kept, count = np.unique(pick, return_counts=True)
        subsets += [t[kept], f[kept] + normal[kept] * e[kept] / np.sqrt(count)]
    return plain_centroid(lags, plain_correlation(*subsets, lags, min_points))


def compare_resampled(rng, lags, resamples=1000, some=20):
    """Print the times of resampled correlations and their ratio."""
    t1, f1, t2, f2, _, least = random_campaign(rng, lags)
    curves = [(t, f, np.full(t.size, 0.05)) for t, f in ((t1, f1), (t2, f2))]
    picks = [rng.integers(0, t.size, (resamples, t.size)) for t, _, _ in curves]
    normals = [rng.standard_normal((resamples, t.size)) for t, _, _ in curves]
    deviates = [a for pair in zip(picks, normals, strict=True) for a in pair]

    def kernel():
        return resampled_centroids(*curves[0], *curves[1], lags, least, 0.8, *deviates)

    def plain():
        return [
            plain_resampled(curves, lags, [p[b] for p in picks], [z[b] for z in normals], least)
            for b in range(some)
        ]

    difference = np.nanmax(np.abs(kernel()[:some] - plain()))
    fast, slow = best_of(kernel, 1), best_of(plain, 1, rounds=3) * resamples / some
    print(f"{resamples} resampled             {1e3 * fast:8.1f} ms")
    print(f"the same, loop, from {some}     {1e3 * slow:8.0f} ms")
    print(f"ratio                       {slow / fast:8.0f}")
    print(f"largest difference          {difference:8.1e}")


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

    compare_resampled(rng, lags)
    whole = best_of(lambda: recover_lag(t1, f1, 0.1, t2, f2, 0.1, lags, 100, rng), 5)
    print(f"recovery, 100 resamples     {1e3 * whole:8.2f} ms")
    many, some = np.sort(rng.uniform(0, 1000, 1800)), np.sort(rng.uniform(0, 1000, 300))
    pair = best_of(lambda: draw_pair(rng, many, some, 60.0, 12.0, 8.0), 50)
    print(f"pair of 1800 + 300 epochs   {1e3 * pair:8.3f} ms")


if __name__ == "__main__":
    main()
