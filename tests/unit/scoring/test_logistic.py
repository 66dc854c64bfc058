import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.special import expit

from planner.scoring.logistic import fit_logistic


def drawn(seed, n, k):
    rng = np.random.default_rng(seed)
    x = np.column_stack([np.ones(n), rng.normal(size=(n, k - 1))])
    return x, rng.random(n) < expit(x @ rng.normal(size=k))


def separated():
    x = np.column_stack([np.ones(40), np.linspace(-2, 2, 40)])
    return x, x[:, 1] > 0.3


def alike(value):
    x, _ = drawn(2, 30, 3)
    return x, np.full(30, value)


def constant_columns():
    x, y = drawn(3, 80, 3)
    return np.column_stack([x, np.full(80, 2.0), np.zeros(80)]), y


CASES = {
    "plain": (drawn(0, 300, 4), 0.25),
    "small ridge": (drawn(1, 100, 3), 1e-3),
    "separated": (separated(), 0.1),
    "all true": (alike(True), 0.25),
    "all false": (alike(False), 0.25),
    "constant columns": (constant_columns(), 0.25),
    "more columns than rows": (drawn(4, 5, 9), 0.5),
    "one row": (drawn(5, 1, 2), 1.0),
}


@pytest.mark.parametrize("name", CASES)
def test_the_maximum_is_that_of_a_general_minimiser(name):
    """Independent: the same penalised likelihood, its derivatives written out, by trust regions."""
    (x, y), ridge = CASES[name]
    sign = np.where(y, 1.0, -1.0)

    def weights(b):
        return (expit(x @ b) * expit(-x @ b))[:, None]

    found = minimize(
        lambda b: -np.log(expit(sign * (x @ b))).sum() + ridge * np.sum(b**2) / 2,
        np.full(x.shape[1], 0.1),
        jac=lambda b: x.T @ (expit(x @ b) - y) + ridge * b,
        hess=lambda b: x.T @ (weights(b) * x) + ridge * np.eye(x.shape[1]),
        method="trust-exact",
        options={"gtol": 1e-11},
    )
    model = fit_logistic(x, y, ridge)
    assert model.coefficients == pytest.approx(found.x, abs=1e-6)
    curvature = x.T @ (weights(found.x) * x) + ridge * np.eye(x.shape[1])
    assert model.covariance @ curvature == pytest.approx(np.eye(x.shape[1]), abs=1e-6)
    assert model.predict(x) == pytest.approx(expit(x @ found.x), abs=1e-6)


def test_separation_with_hardly_any_ridge_stays_finite():
    x, y = separated()
    model = fit_logistic(x * [1.0, 1e3], y, 1e-9)
    assert np.all(np.isfinite(model.coefficients))
    assert np.all(np.isfinite(model.covariance))
    assert np.all((model.predict(x * [1.0, 1e3]) > 0.5) == y)


def test_a_column_of_ones_alone_gives_the_share_and_its_error():
    """The delta method by hand: the log odds of k of n have variance 1/k + 1/(n - k)."""
    x = np.ones((400, 1))
    model = fit_logistic(x, np.arange(400) < 300, 1e-9)
    lo, hi = model.interval(x[:1], 1.645)
    half = 1.645 * np.sqrt(1 / 300 + 1 / 100)
    assert model.predict(x[:1]) == pytest.approx([0.75], abs=1e-9)
    assert [lo[0], hi[0]] == pytest.approx([expit(np.log(3) - half), expit(np.log(3) + half)])


def test_equal_columns_share_the_coefficient():
    x, y = drawn(6, 200, 2)
    model = fit_logistic(np.column_stack([x, x[:, 1]]), y, 0.1)
    assert model.coefficients[1] == pytest.approx(model.coefficients[2])


def test_far_rows_do_not_overflow():
    x, y = drawn(7, 50, 2)
    model = fit_logistic(x, y, 0.1)
    assert set(model.predict(np.array([[0.0, 1e6], [0.0, -1e6]]))) == {0.0, 1.0}


@pytest.mark.parametrize(
    ("x", "y", "ridge", "message"),
    [
        (np.ones((3, 1)), np.ones(3, bool), 0.0, "above 0"),
        (np.ones((3, 1)), np.ones(3, bool), np.nan, "above 0"),
        (np.ones((3, 1)), np.ones(4, bool), 1.0, "must match"),
        (np.full((3, 1), np.nan), np.ones(3, bool), 1.0, "finite"),
    ],
)
def test_what_cannot_be_fitted_is_refused(x, y, ridge, message):
    with pytest.raises(ValueError, match=message):
        fit_logistic(x, y, ridge)
