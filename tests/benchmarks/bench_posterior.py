"""Posterior of a lag against plain dense algebra; run as ``python bench_posterior.py``.

One thread, 120 + 40 irregular epochs, 200 lags. The plain twin builds the joint covariance of
each lag with NumPy and factors it with scipy; where the scale is unknown it factors it anew for
nine scales. Prints both ratios and the time of one whole posterior with all nuisances.
"""

import time

import numpy as np
from scipy.linalg import cho_factor, cho_solve

from planner.lightcurves import draw_pair
from planner.recovery.joint import continuum_factor, joint_log_likelihood, line_given, make_pair
from planner.recovery.posterior import Belief, lag_posterior
from planner.recovery.response import Response

SIGMA, TAU, SCALE, WIDTH = 0.15, 60.0, 0.6, 0.5
RESPONSE = Response("top_hat", WIDTH)


def plain_cross(d, w):
    near = np.abs(d)
    outside = np.exp(-near / TAU) * np.sinh(w / 2 / TAU) * 2 * TAU / w
    inside = TAU / w * (2 - np.exp(-(w / 2 + d) / TAU) - np.exp(-(w / 2 - d) / TAU))
    return np.where(near < w / 2, inside, outside)


def plain_line(d, w):
    def twice(x):
        return TAU**2 * np.exp(-np.abs(x) / TAU) + TAU * np.abs(x)

    return (twice(d + w) - 2 * twice(d) + twice(d - w)) / w**2


def plain_log_likelihood(curves, lag, scales):
    """Log likelihood for each scale, offsets integrated out."""
    t1, f1, e1, t2, f2, e2 = curves
    n, m = t1.size, t2.size
    own = np.exp(-np.abs(t1[:, None] - t1) / TAU)
    cross = plain_cross(t2 - lag - t1[:, None], WIDTH * lag)
    line = plain_line(t2[:, None] - t2, WIDTH * lag)
    columns = np.zeros((n + m, 3))
    columns[:n, 0], columns[n:, 1], columns[:, 2] = 1.0, 1.0, np.concatenate([f1, f2])
    noise = np.concatenate([e1, e2]) ** 2
    out, covariance = [], np.empty((n + m, n + m))
    for scale in scales:
        covariance[:n, :n], covariance[:n, n:] = own, scale * cross
        covariance[n:, :n], covariance[n:, n:] = scale * cross.T, scale**2 * line
        factor = cho_factor(SIGMA**2 * covariance + np.diag(noise), lower=True)
        gram = columns.T @ cho_solve(factor, columns)
        rest = gram[2, 2] - gram[:2, 2] @ np.linalg.solve(gram[:2, :2], gram[:2, 2])
        log_det = 2 * np.log(np.diag(factor[0])).sum() + np.linalg.slogdet(gram[:2, :2])[1]
        out.append(-0.5 * (rest + log_det + (n + m - 2) * np.log(2 * np.pi)))
    return out


def best_of(call, rounds=5):
    call()
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        call()
        times.append(time.perf_counter() - start)
    return min(times)


def main():
    rng = np.random.default_rng(0)
    t1, t2 = np.sort(rng.uniform(0, 160, 120)), np.sort(rng.uniform(0, 160, 40))
    x, y = draw_pair(rng, t1, t2, TAU, 20.0, 10.0)
    e1, e2 = np.full(120, 0.05 * SIGMA), np.full(40, 0.1 * SIGMA * SCALE)
    f1 = 1 + SIGMA * x + e1 * rng.standard_normal(120)
    f2 = 1 + SIGMA * SCALE * y + e2 * rng.standard_normal(40)
    curves, lags = (t1, f1, e1, t2, f2, e2), np.linspace(2.0, 80.0, 200)
    pair, scales = make_pair(*curves), SCALE * 10 ** np.linspace(-0.4, 0.4, 9)

    def known():
        return joint_log_likelihood(pair, lags, SIGMA, TAU, SCALE, RESPONSE)

    def averaged():
        return line_given(pair, continuum_factor(pair, SIGMA, TAU), lags, RESPONSE, SCALE, 0.15)

    plain = np.array([plain_log_likelihood(curves, lag, [SCALE])[0] for lag in lags])
    print(f"largest difference {np.abs(known() - plain).max():.1e}")
    for name, fast, some, rounds in (
        ("known", known, [SCALE], 5),
        ("averaged", averaged, scales, 2),
    ):
        slow_s = best_of(
            lambda some=some: [plain_log_likelihood(curves, a, some) for a in lags], rounds
        )
        fast_s = best_of(fast)
        print(
            f"200 lags, scale {name}: {1e3 * fast_s:.1f} ms, plain {1e3 * slow_s:.0f} ms, "
            f"ratio {slow_s / fast_s:.1f}"
        )
    whole = best_of(lambda: lag_posterior(*curves, 2.0, 80.0, Belief(TAU)))
    print(f"whole posterior, all unknown: {1e3 * whole:.0f} ms")


if __name__ == "__main__":
    main()
