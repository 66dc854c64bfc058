"""Expected recovery against full recoveries; run as ``python bench_information.py [LAYOUTS]``.

Each layout has a season, cadences, losses, errors and a lag of its own. Eight draws of lag,
walk, response and lost nights go to the forecast, close epochs averaged as for a layout; full
recoveries of fresh light curves, with every parameter unknown, run through the same eight draws.
Prints one line for each layout, then correlation and mean absolute difference of the two rates of
success and the time of one draw.
Without an argument: 64 layouts of 120 recoveries each, some minutes on one core. With the argument
``forecasts``, only the time of forecasting 1000 layouts with 8 draws each on two cores, from 100.
"""

import sys
import time

import numpy as np

from planner.base.workers import Workers
from planner.lightcurves import draw_pair
from planner.recovery.expected import expected_recovery
from planner.recovery.information import make_design, with_normal_points
from planner.recovery.posterior import Belief, lag_posterior
from planner.recovery.response import Response
from planner.scoring.forecasting import BIN

LO_D, HI_D, WITHIN, ERROR_BELOW = 1.0, 100.0, 0.3, 0.3
SIGMA, SCALE, TAU_D = 0.15, 0.6, 60.0
BELIEF = Belief(TAU_D, 0.3, SIGMA, 0.2, SCALE, 0.15)


def random_layout(rng):
    return {
        "season_d": rng.choice([60, 90, 120, 180]),
        "seasons": rng.choice([1, 1, 2]),
        "cadence1_d": rng.choice([1, 2, 4]),
        "cadence2_d": rng.choice([2, 4, 6, 10]),
        "error1": SIGMA * 10 ** rng.uniform(-1.5, -0.2),
        "error2": SIGMA * SCALE * 10 ** rng.uniform(-1.2, 0.1),
        "lag_d": 10 ** rng.uniform(0.7, 1.7),
        "lost": rng.uniform(0.1, 0.5),
    }


def epochs(layout, cadence_d, rng):
    night = np.arange(0, layout["season_d"], cadence_d, dtype=float)
    t = np.concatenate([night + 365.0 * season for season in range(layout["seasons"])])
    return (t + rng.uniform(-0.1, 0.1, t.size))[rng.uniform(size=t.size) > layout["lost"]]


def random_design(layout, rng):
    return make_design(
        epochs(layout, layout["cadence1_d"], rng),
        layout["error1"],
        epochs(layout, layout["cadence2_d"], rng),
        layout["error2"],
        layout["lag_d"] * 10 ** (0.1 * rng.standard_normal()),
        SIGMA * 10 ** (0.2 * rng.standard_normal()),
        TAU_D * 10 ** (0.3 * rng.standard_normal()),
        SCALE * 10 ** (0.15 * rng.standard_normal()),
        BELIEF.responses[rng.integers(3)],
    )


def recovers(design, rng):
    """Simulate and recover once; return success."""
    width = Response.widths_d(design.response, np.array([design.lag_d]))[0]
    x, y = draw_pair(rng, design.t1_d, design.t2_d, design.tau_d, design.lag_d, width)
    f1 = 1.0 + design.sigma * x + design.e1 * rng.standard_normal(x.size)
    f2 = 1.0 + design.sigma * design.scale * y + design.e2 * rng.standard_normal(y.size)
    found = lag_posterior(
        design.t1_d, f1, design.e1, design.t2_d, f2, design.e2, LO_D, HI_D, BELIEF
    )
    is_right = abs(found.lag_d - design.lag_d) <= WITHIN * design.lag_d
    return is_right and 0.5 * (found.lag_hi_d - found.lag_lo_d) < ERROR_BELOW * found.lag_d


def compare(layouts, trials, first=0, show=print):
    """Return forecast and true rate of success of each layout, and seconds for each draw."""
    forecasts, rates, spent = [], [], 0.0
    for k in range(first, first + layouts):
        rng = np.random.default_rng((20, k))
        layout = random_layout(rng)
        designs = [random_design(layout, rng) for _ in range(8)]
        start = time.perf_counter()
        merged = [with_normal_points(design, BIN) for design in designs]
        expected = expected_recovery(merged, LO_D, HI_D, WITHIN, ERROR_BELOW, rng)
        spent += time.perf_counter() - start
        rate = np.mean([recovers(designs[j % 8], rng) for j in range(trials)])
        forecasts.append(expected.success)
        rates.append(rate)
        show(f"{k:3d}  expected {expected.success:.3f}  recovered {rate:.3f}")
    return np.array(forecasts), np.array(rates), spent / (8 * layouts)


def forecast(k):
    """Forecast one layout from eight draws."""
    rng = np.random.default_rng((21, k))
    layout = random_layout(rng)
    designs = [with_normal_points(random_design(layout, rng), BIN) for _ in range(8)]
    return expected_recovery(designs, LO_D, HI_D, WITHIN, ERROR_BELOW, rng).success


def time_forecasts(layouts=100, workers=2):
    """Print the time of many forecasts, processes started beforehand."""
    start = time.perf_counter()
    with Workers(workers) as crew:
        list(crew.each(forecast, [0, 0]))
        starting = time.perf_counter() - start
        start = time.perf_counter()
        list(crew.each(forecast, list(range(layouts))))
        spent = time.perf_counter() - start
    print(f"starting {workers} processes {starting:.1f} s")
    print(f"{layouts} layouts x 8 draws {spent:.1f} s; 1000 layouts {1000 / layouts * spent:.0f} s")


def main(layouts=64, trials=120):
    compare(1, 8, show=lambda _: None)
    forecasts, rates, seconds = compare(layouts, trials)
    print(f"correlation {np.corrcoef(forecasts, rates)[0, 1]:.3f}")
    print(f"mean absolute difference {np.abs(forecasts - rates).mean():.3f}")
    print(f"mean difference {np.mean(forecasts - rates):+.3f}")
    print(f"time of one draw {1e3 * seconds:.1f} ms")


if __name__ == "__main__":
    if sys.argv[1:] == ["forecasts"]:
        time_forecasts()
    else:
        main(*(int(argument) for argument in sys.argv[1:]))
