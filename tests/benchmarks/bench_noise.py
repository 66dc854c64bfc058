"""Time of the flux errors of a million epochs.

Run as ``python tests/benchmarks/bench_noise.py``.
"""

import time
from dataclasses import replace

import numpy as np

from planner.model.observatory import (
    Camera,
    Feed,
    KnownCase,
    LineMeasurement,
    Spectrograph,
    Telescope,
    TimeAllotment,
)
from planner.telescope import Conditions, image_error, line_error

EPOCHS = 1_000_000
TELESCOPE = Telescope("C", "ridge", 1.0, 0.3, 60.0, 30.0, 0.0, TimeAllotment())
CAMERA = Camera("V", 0.4, 0.5, 8.0, 0.05, 1.0, 14.0, 4)
SLIT = Spectrograph(0.25, 1.5, 6.0, 2.0, False, 20.0, 5600.0, 0.3, 4.0, 0.002)
KNOWN = KnownCase(80.0, "V", 16.0, 300.0, 1.2, None, 0.05)


def main():
    """Print seconds by instrument."""
    rng = np.random.default_rng(4)
    conditions = Conditions(
        rng.uniform(1, 2, EPOCHS),
        rng.uniform(18, 22, EPOCHS),
        0.15,
        rng.uniform(0.8, 2, EPOCHS),
        rng.uniform(-180, 180, EPOCHS),
        21.6,
    )
    measurement = LineMeasurement(100.0, 30.0)
    for name, instrument in {
        "camera": CAMERA,
        "known image": KNOWN,
        "slit": SLIT,
        "fibre": replace(SLIT, fibre=True),
        "known spectrum": KNOWN,
    }.items():
        feed = Feed("C", instrument, 0.01, None, 0.02, 3600.0, 2, 20.0, 100.0, 0.0, 1.0)
        start = time.perf_counter()
        if name in {"camera", "known image"}:
            image_error(feed, TELESCOPE, 16.5, 300.0, conditions)
        else:
            line_error(
                feed, TELESCOPE, measurement, 16.5, 1200.0, conditions, 80.0, 4000.0, 5100.0, 0.05
            )
        print(f"{EPOCHS} epochs, {name}: {time.perf_counter() - start:.2f} s")


if __name__ == "__main__":
    main()
