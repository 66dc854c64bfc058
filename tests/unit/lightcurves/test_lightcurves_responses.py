import numpy as np
import pytest
from scipy.integrate import quad

from planner.lightcurves.responses import longest_delay, response_weights

LAG, WIDTH, STEP = 20.0, 13.0, 0.7


def density(response, s):
    """The textbook densities of the delay, without the grid."""
    if response == "long tail":
        return 4 * s * np.exp(-2 * s / LAG) / LAG**2
    width = 2 * LAG if response == "shell" else WIDTH
    return (abs(s - LAG) <= width / 2) / width


@pytest.mark.parametrize("response", ["top hat", "shell", "long tail"])
def test_weights_are_the_response_seen_through_straight_pieces(response):
    weights = response_weights(response, LAG, WIDTH, STEP)
    for j in (0, 1, 14, 19, 28, 38, 56):
        if j >= weights.size:
            continue
        node = j * STEP
        low, high = max(node - STEP, 0.0), node + STEP
        edges = [node, LAG - WIDTH / 2, LAG + WIDTH / 2, 2 * LAG]
        expected = quad(
            lambda s, node=node: density(response, s) * (1 - abs(s - node) / STEP),
            low,
            high,
            points=[e for e in edges if low < e < high],
        )[0]
        assert weights[j] == pytest.approx(expected, rel=1e-7, abs=1e-12)


@pytest.mark.parametrize("step", [0.05, 0.7, 9.0])
@pytest.mark.parametrize(
    ("response", "spread"),
    [  # standard deviation over the lag
        ("top hat", WIDTH / LAG / np.sqrt(12)),
        ("shell", 1 / np.sqrt(3)),
        ("long tail", 1 / np.sqrt(2)),
    ],
)
def test_mean_delay_is_the_lag_whatever_the_step(response, spread, step):
    weights = response_weights(response, LAG, WIDTH, step)
    delay = step * np.arange(weights.size)
    assert weights.min() > -1e-12
    assert weights.sum() == pytest.approx(1.0, abs=1e-8)
    assert weights @ delay == pytest.approx(LAG, rel=1e-7)
    if step == 0.05:
        assert np.sqrt(weights @ (delay - LAG) ** 2) == pytest.approx(spread * LAG, rel=1e-4)


def test_long_tail_is_skewed_as_a_gamma_density_of_shape_2():
    weights = response_weights("long tail", LAG, 0.0, 0.05)
    delay = 0.05 * np.arange(weights.size)
    assert delay[weights.argmax()] == pytest.approx(LAG / 2, abs=0.05)
    third = weights @ (delay - LAG) ** 3 / (LAG / np.sqrt(2)) ** 3
    assert third == pytest.approx(2 / np.sqrt(2), rel=1e-3)


def test_sharp_response_shares_its_weight_between_two_nodes():
    weights = response_weights("top hat", 3.3, 0.0, 1.0)
    np.testing.assert_allclose(weights, [0, 0, 0, 0.7, 0.3], atol=1e-14)


def test_nothing_answers_after_the_longest_delay():
    assert longest_delay("top hat", LAG, WIDTH) == LAG + WIDTH / 2
    assert longest_delay("shell", LAG, WIDTH) == 2 * LAG
    assert longest_delay("long tail", LAG, WIDTH) > 10 * LAG
    for response in ("top hat", "shell", "long tail"):
        last = STEP * (response_weights(response, LAG, WIDTH, STEP).size - 1)
        assert 0 <= last - longest_delay(response, LAG, WIDTH) < STEP


@pytest.mark.parametrize(
    ("response", "lag", "width"),
    [("ring", 5.0, 1.0), ("shell", 0.0, 0.0), ("top hat", 5.0, 10.1), ("top hat", 5.0, -0.1)],
)
def test_impossible_responses_are_refused(response, lag, width):
    with pytest.raises(ValueError, match=r"ring|need lag_d"):
        response_weights(response, lag, width, 1.0)
