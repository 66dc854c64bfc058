import numpy as np
import pytest

from planner.kernels.joint_forecast import log_likelihoods, simulated_lines
from planner.recovery import expected
from planner.recovery.ambiguity import factor_of
from planner.recovery.density import quantiles
from planner.recovery.expected import expected_recovery
from planner.recovery.information import make_design
from planner.recovery.response import Response, cross_covariance, line_covariance

HALF = Response("top_hat", 0.5)


def design(n=20, m=9, lag=10.0, response=HALF, error=0.03, seed=0):
    rng = np.random.default_rng(seed)
    return make_design(
        rng.uniform(0, 60, n), error, rng.uniform(0, 60, m), error, lag, 0.2, 30.0, 0.7, response
    )


def kernel_case(n=12, m=6, r=3, telescopes=2):
    """Return arguments of the kernels and, dense, what they whiten the continuum with."""
    rng = np.random.default_rng(2)
    t1, e1 = np.sort(rng.uniform(0, 40, n)), rng.uniform(0.1, 0.3, n)
    t2, err2 = np.sort(rng.uniform(0, 40, m)), rng.uniform(0.2, 0.4, m)
    labels = (np.arange(n) % telescopes)[:, None] == np.arange(telescopes)
    one = make_design(t1, e1, t2, err2, 8.0, 1.0, 30.0, 0.8, HALF, np.arange(n) % telescopes)
    factor, basis = factor_of(one)
    lags = np.array([5.0, 8.0])
    cross = cross_covariance(one.t1_d, one.t2_d, lags, 30.0, HALF)
    line = line_covariance(one.t2_d, lags, 30.0, HALF)
    own = np.exp(-np.abs(t1[:, None] - t1) / 30.0) + np.diag(e1**2)
    root = np.linalg.inv(np.linalg.cholesky(own))
    plane = np.linalg.qr(root @ labels)[0]
    free = np.eye(n) - plane @ plane.T
    normals = rng.standard_normal((r, n)) @ free
    return (factor, basis, cross, line, err2, 0.8, normals), free @ root @ cross, rng


@pytest.mark.parametrize("m", [6, 8])
def test_kernel_agrees_with_dense_algebra(m):
    case, white, rng = kernel_case(m=m)
    _, _, _, line, err, rms, normals = case
    lines = rng.standard_normal((3, m))
    found = log_likelihoods(*case, lines, 2.0)
    for k in range(2):
        covariance = rms**2 * (line[k] - white[k].T @ white[k]) + np.diag(err**2)
        for c in range(3):
            column = rms * white[k].T @ normals[c]
            # The offset's flat prior as a wide one; the ratio of its density to 1 is put back.
            wide = covariance + np.outer(column, column) / 2.0 + 1e6
            rest = lines[c] - column
            density = -0.5 * (rest @ np.linalg.solve(wide, rest) + np.linalg.slogdet(wide)[1])
            assert found[k, c] == pytest.approx(density + 0.5 * np.log(1e6), abs=1e-4)


def test_simulated_lines_agree_with_dense_algebra():
    case, white, rng = kernel_case()
    factor, basis, cross, line, err, rms, normals = case
    own = rng.standard_normal((3, 6))
    found = simulated_lines(factor, basis, cross[1], line[1], err, rms, normals, own)
    covariance = rms**2 * (line[1] - white[1].T @ white[1]) + np.diag(err**2)
    expected = rms * normals @ white[1] + own @ np.linalg.cholesky(covariance).T
    np.testing.assert_allclose(found, expected, rtol=1e-9, atol=1e-10)


def test_lags_left_out_do_not_matter(monkeypatch):
    """All lags of the grid against those that have hope; same draws."""
    cases = [design(40, 18, error=e, seed=k) for k, e in enumerate([0.01, 0.05, 0.1, 0.2])]

    def found():
        return [
            expected_recovery([one], 1.0, 60.0, 0.3, 0.3, np.random.default_rng(3), 32)
            for one in cases
        ]

    some = found()
    monkeypatch.setattr(expected, "STEP", 1)
    every = found()
    assert 0.0 < np.mean([f.success for f in every]) < 1.0
    np.testing.assert_allclose(
        [f.success for f in some], [f.success for f in every], atol=1.0 / 32.0
    )


def test_quantiles_of_many_are_those_of_each():
    rng = np.random.default_rng(4)
    x, density = np.sort(rng.uniform(0, 9, 30)), rng.uniform(size=(30, 5)) ** 4
    found = expected._quantiles(x, density, (0.16, 0.5, 0.84))
    for c in range(5):
        one = quantiles(x, density[:, c], np.array([0.16, 0.5, 0.84]))
        np.testing.assert_allclose(found[:, c], one, rtol=1e-12)


def test_expected_recovery_tells_good_from_bad():
    settings = (1.0, 40.0, 0.3, 0.3)
    good = [design(60, 25, error=0.004, seed=k) for k in range(2)]
    bad = [design(20, 9, error=0.3, seed=k) for k in range(2)]
    high = expected_recovery(good, *settings, np.random.default_rng(0), 8)
    low = expected_recovery(bad, *settings, np.random.default_rng(0), 8)
    assert high.success > 0.7
    assert low.success < 0.2
    assert high.simulations == 16
    assert high.success <= min(high.claims, high.right)
    again = expected_recovery(good, *settings, np.random.default_rng(0), 8)
    assert again == high


def test_a_prior_helps():
    bad = [design(20, 9, error=0.15, seed=k) for k in range(3)]
    settings = (1.0, 40.0, 0.3, 0.3, np.random.default_rng(0), 8)
    tight = expected_recovery(bad, *settings, prior=lambda lag: np.exp(-0.5 * (lag - 10) ** 2))
    assert tight.success == 1.0
    assert expected_recovery(bad, *settings).success < 0.9


def test_a_prior_between_coarse_lags_is_found():
    bad = [design(20, 9, error=0.3)]
    at = np.linspace(1.0, 40.0, expected.GRID)[expected.STEP + 1]
    found = expected_recovery(
        bad, 1.0, 40.0, 1.0, 0.3, np.random.default_rng(0), 8,
        prior=lambda lag: (np.abs(lag - at) < 0.1).astype(float),
    )  # fmt: skip
    assert found.claims == found.right == 1.0
