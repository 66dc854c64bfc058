import numpy as np
import pytest
from scipy.stats import norm

from planner.recovery.density import normalised, peaks, quantiles

X = np.linspace(0.0, 10.0, 2001)


def bumps(*places):
    return sum(weight * norm.pdf(X, where, 0.3) for where, weight in places)


def test_quantiles_of_a_gaussian():
    density = normalised(X, norm.logpdf(X, 4.0, 0.5))
    wanted = np.array([0.16, 0.5, 0.84])
    assert quantiles(X, density, wanted) == pytest.approx(norm.ppf(wanted, 4.0, 0.5), abs=1e-4)


def test_quantiles_are_exact_for_a_piecewise_linear_density():
    """A triangle on [0, 2]: its cumulative is x^2 / 2 up to its middle."""
    x, density = np.array([0.0, 1.0, 2.0]), np.array([0.0, 1.0, 0.0])
    found = quantiles(x, density, np.array([0.125, 0.5, 0.875]))
    assert found == pytest.approx([0.5, 1.0, 1.5])


def test_quantiles_step_over_stretches_without_probability():
    x, density = np.arange(6.0), np.array([1.0, 1.0, 0.0, 0.0, 1.0, 1.0]) / 3.0
    assert quantiles(x, density, np.array([0.25, 0.75])) == pytest.approx([0.75, 4.25])


def test_peaks_carry_their_share():
    found = peaks(X, bumps((2.0, 0.7), (5.0, 0.1), (8.0, 0.2)))
    assert [alias.lag_d for alias in found] == pytest.approx([2.0, 8.0, 5.0], abs=0.01)
    assert [alias.share for alias in found] == pytest.approx([0.7, 0.2, 0.1], abs=1e-3)


def test_shoulders_are_no_peaks_and_small_peaks_are_left_out():
    assert len(peaks(X, bumps((4.0, 0.5), (4.5, 0.5)))) == 1
    assert len(peaks(X, bumps((2.0, 0.995), (8.0, 0.005)))) == 1
    assert len(peaks(X, np.ones(X.size))) == 1


@pytest.mark.parametrize("edge", [0.0, 10.0])
def test_peak_at_an_edge(edge):
    found = peaks(X, bumps((edge, 1.0), (5.0, 0.2)))
    assert found[0].lag_d == edge
    assert len(found) == 2
