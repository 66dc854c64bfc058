"""On evenly sampled data and whole-step lags, correlation is NumPy's own."""

import numpy as np

from planner.recovery import correlation


def test_correlation_equals_corrcoef_on_even_data():
    rng = np.random.default_rng(2)
    n = 60
    f1, f2 = np.cumsum(rng.normal(size=n)), np.cumsum(rng.normal(size=n))
    t = np.arange(n, dtype=float)
    lags = np.arange(-40, 41)
    expected = [
        np.corrcoef(f1[max(-k, 0) : n - max(k, 0)], f2[max(k, 0) : n + min(k, 0)])[0, 1]
        for k in lags
    ]
    np.testing.assert_allclose(correlation(t, f1, t, f2, lags), expected, atol=1e-12)
