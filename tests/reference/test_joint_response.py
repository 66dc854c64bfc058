"""Response covariances against numerical integration of their definition."""

from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad

from planner.recovery.response import Response, cross_covariance, line_covariance

LAG = 10.0
SHAPES = [
    Response("top_hat", 0.5),
    Response("shell"),
    Response("gaussian", 0.2),
    Response("ring", 0.6),
    Response("ring", 1.0),
]
DISTANCES = [0.0, 0.7, 2.5, 4.999, 5.0, 6.0, 9.3, 10.0, 14.0, 20.0, 33.0]


def mean_over(response, function, kinks):
    """Mean of function(delay - LAG) over the response, split at the kinks."""
    w = response.widths_d(np.array([LAG]))[0]
    if response.shape in {"top_hat", "shell"}:
        ends, weight, place = (-w / 2, w / 2), lambda _: 1 / w, lambda u: u
        cuts = kinks
    elif response.shape == "gaussian":
        ends = (-12 * w, 12 * w)
        weight, place = (
            lambda u: np.exp(-0.5 * (u / w) ** 2) / (w * np.sqrt(2 * np.pi)),
            lambda u: u,
        )
        cuts = [*kinks, 0.0, -3 * w, 3 * w]
    else:
        ends, weight, place = (0.0, np.pi), lambda _: 1 / np.pi, lambda u: w * np.cos(u)
        cuts = [np.arccos(k / w) for k in kinks if abs(k) < w]
    edges = sorted({*ends, *(c for c in cuts if ends[0] < c < ends[1])})
    return sum(
        quad(lambda u: weight(u) * function(place(u)), a, b, epsabs=1e-13, epsrel=1e-12, limit=200)[
            0
        ]
        for a, b in pairwise(edges)
    )


def reach(response):
    return {"gaussian": 0.0, "ring": 1.0}.get(response.shape, 0.5) * response.widths_d(
        np.array([LAG])
    )[0]


def cross_at(d, tau, response):
    """Library's covariance of the walk at 0 with a response whose centre lies d later."""
    return cross_covariance([0.0], [LAG + d], [LAG], tau, response)[0, 0, 0]


@pytest.mark.parametrize("tau", [1.5, 40.0, 3000.0])
@pytest.mark.parametrize("response", SHAPES, ids=str)
def test_continuum_with_line(response, tau):
    for d in DISTANCES:
        expected = mean_over(response, lambda u, d=d: np.exp(-abs(d - u) / tau), [d])
        assert cross_at(d, tau, response) == pytest.approx(expected, rel=1e-9)
        assert cross_at(-d, tau, response) == pytest.approx(expected, rel=1e-9)


@pytest.mark.slow
@pytest.mark.parametrize("tau", [1.5, 40.0, 3000.0])
@pytest.mark.parametrize("response", SHAPES, ids=str)
def test_line_with_itself(response, tau):
    """One more mean over the response, of the covariance that the test above has checked."""
    far = reach(response)
    for d in DISTANCES:
        kinks = [d, d - far, d + far]
        expected = mean_over(response, lambda u, d=d: cross_at(d - u, tau, response), kinks)
        found = line_covariance([0.0, d], [LAG], tau, response)[0]
        assert found[0, 1] == pytest.approx(expected, rel=1e-8)
        assert found[1, 0] == found[0, 1]


@pytest.mark.parametrize("shape", ["top_hat", "gaussian", "ring"])
def test_runs_of_epochs_agree_with_single_pairs(shape):
    """A whole light curve is filled by recursion; pair by pair it is not."""
    rng = np.random.default_rng(3)
    t1, t2 = np.sort(rng.uniform(0, 90, 25)), np.sort(rng.uniform(0, 90, 8))
    response, lags = Response(shape, 0.7), np.array([-15.0, 0.0, 4.0, 30.0])
    cross = cross_covariance(t1, t2, lags, 20.0, response)
    line = line_covariance(t2, lags, 20.0, response)
    for k, lag in enumerate(lags):
        single = [
            [cross_covariance([a], [b], [lag], 20.0, response)[0, 0, 0] for b in t2] for a in t1
        ]
        assert cross[k] == pytest.approx(np.array(single), rel=1e-12)
        pairs = [
            [line_covariance(sorted([a, b]), [lag], 20.0, response)[0, 0, 1] for b in t2]
            for a in t2
        ]
        assert line[k] == pytest.approx(np.array(pairs), rel=1e-11)


@pytest.mark.parametrize("width", [1e-6, 1e-3, 0.0499, 0.0501])
def test_narrow_top_hats_do_not_cancel(width):
    """Second-order expansion of sinh(a) / a and of the covariance at zero distance."""
    response, tau = Response("top_hat", width), LAG
    share = cross_at(20.0, tau, response) / np.exp(-20.0 / tau)
    assert share == pytest.approx(1 + width**2 / 24 + width**4 / 1920, rel=1e-11)
    own = line_covariance([0.0], [LAG], tau, response)[0, 0, 0]
    series = 1 - width / 3 + width**2 / 12 - width**3 / 60 + width**4 / 360 - width**5 / 2520
    assert own == pytest.approx(series, rel=1e-9)
