import numpy as np
import pytest

from planner.recovery.response import Response, cross_covariance, line_covariance

T1, T2 = np.linspace(0.0, 60.0, 31), np.linspace(3.0, 57.0, 10)


def test_shell_is_a_top_hat_from_zero_to_twice_the_lag():
    lags = [7.0, 20.0]
    assert np.array_equal(
        cross_covariance(T1, T2, lags, 30.0, Response("shell")),
        cross_covariance(T1, T2, lags, 30.0, Response("top_hat", 2.0)),
    )


@pytest.mark.parametrize("shape", ["top_hat", "gaussian", "ring"])
def test_sharp_response_is_the_walk_itself(shape):
    response = Response(shape, 0.0)
    distance = np.abs(T2 - 9.0 - T1[:, None])
    assert cross_covariance(T1, T2, [9.0], 30.0, response)[0] == pytest.approx(
        np.exp(-distance / 30)
    )
    own = np.exp(-np.abs(T2[:, None] - T2) / 30)
    assert line_covariance(T2, [9.0], 30.0, response)[0] == pytest.approx(own)


@pytest.mark.parametrize(
    "response",
    [Response("top_hat", 1.2), Response("gaussian", 0.4), Response("ring", 0.9)],
    ids=str,
)
def test_joint_covariance_is_one(response):
    """A covariance has no negative eigenvalue; a wrong cross block would give some."""
    own = np.exp(-np.abs(T1[:, None] - T1) / 30)
    cross = cross_covariance(T1, T2, [9.0], 30.0, response)[0]
    line = line_covariance(T2, [9.0], 30.0, response)[0]
    values = np.linalg.eigvalsh(np.block([[own, cross], [cross.T, line]]))
    assert values.min() > 0.0


def test_width_grows_with_the_size_of_the_lag():
    assert Response("top_hat", 0.5).widths_d(np.array([-4.0, 0.0, 8.0])).tolist() == [2.0, 0.0, 4.0]


@pytest.mark.parametrize(
    ("shape", "width"), [("box", 1.0), ("top_hat", -0.1), ("gaussian", np.nan), ("ring", 1.1)]
)
def test_impossible_responses_are_refused(shape, width):
    with pytest.raises(ValueError, match=r"unknown shape|impossible"):
        Response(shape, width)
