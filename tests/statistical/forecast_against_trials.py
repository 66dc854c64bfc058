"""Expected against recovered success of random layouts.

Run as ``python tests/statistical/forecast_against_trials.py [LAYOUTS [RECOVERIES]]`` to draw the
figure beside this file; 64 layouts of 120 recoveries take ten minutes on one core.
"""

import importlib.util
import sys
from pathlib import Path

import numpy as np

spec = importlib.util.spec_from_file_location(
    "bench_information", Path(__file__).parents[1] / "benchmarks" / "bench_information.py"
)
bench_information = importlib.util.module_from_spec(spec)
spec.loader.exec_module(bench_information)


def layouts_of(count):
    """Return the benchmark's layouts; each is drawn first from its own stream."""
    return [bench_information.random_layout(np.random.default_rng((20, k))) for k in range(count)]


def kind_of(layout):
    """Return the seasons of a layout in words."""
    if layout["seasons"] == 2:
        return "two seasons"
    return "one, up to 90 d" if layout["season_d"] <= 90 else "one, 120 or 180 d"


# Colours of Okabe & Ito, told apart by shape too.
KINDS = {
    "one, up to 90 d": ("#D55E00", "^"),
    "one, 120 or 180 d": ("#0072B2", "o"),
    "two seasons": ("#009E73", "s"),
}


def draw(expected, recovered, recoveries, kinds, path):
    """Draw the scatter plot."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=(5.2, 5.0), layout="constrained")
    ax = figure.subplots()
    ax.plot([0, 1], [0, 1], color="0.4", lw=1)
    error = np.sqrt(recovered * (1 - recovered) / recoveries)
    for kind, (colour, marker) in KINDS.items():
        of = np.array([k == kind for k in kinds])
        ax.errorbar(
            expected[of], recovered[of], error[of], fmt=marker, ms=5, lw=0.8,
            color=colour, label=kind,
        )  # fmt: skip
    ax.annotate("equal", (0.9, 0.9), (4, -12), textcoords="offset points", color="0.4")
    ax.set(xlabel="success expected, 8 draws", xlim=(-0.03, 1.03), ylim=(-0.03, 1.03))
    ax.set_ylabel(f"success of {recoveries} recoveries by likelihood")
    ax.set_title(
        f"{expected.size} layouts: correlation {np.corrcoef(expected, recovered)[0, 1]:.3f}, "
        f"mean absolute difference {np.abs(expected - recovered).mean():.3f}",
        fontsize=10,
    )
    ax.legend(title="seasons", frameon=False, loc="upper left")
    ax.set_aspect("equal")
    figure.savefig(path, dpi=120)


def main(layouts=64, recoveries=120):
    expected, recovered, _ = bench_information.compare(layouts, recoveries)
    kinds = [kind_of(layout) for layout in layouts_of(layouts)]
    draw(expected, recovered, recoveries, kinds, Path(__file__).with_suffix(".png"))


if __name__ == "__main__":
    main(*(int(argument) for argument in sys.argv[1:]))
