"""Time of the sky's brightness over 20 targets for a year in steps of 10 minutes.

Run as ``python tests/benchmarks/bench_sky_brightness.py``.
"""

import time

import numpy as np

from planner.model.observatory import Site, SkyQuality, WeatherClimate
from planner.sky import sky_at

QUALITY = SkyQuality(1.2, (("B", 22.6), ("V", 21.7), ("R", 20.9)), (("B", 0.25), ("V", 0.13)))
SITE = Site("Ridge", -30.4, -70.9, 2300.0, None, WeatherClimate((1.0,) * 12, 2.0), QUALITY)


def main():
    """Print the best of three."""
    rng = np.random.default_rng(4)
    ra, dec = rng.uniform(0, 360, 20)[:, None], rng.uniform(-80, 30, 20)[:, None]
    mjd = 61465.0 + np.arange(0, 365, 10 / 1440)
    spent = []
    for _ in range(3):
        start = time.perf_counter()
        values = sky_at(ra, dec, SITE, 5000.0, mjd)
        spent.append(time.perf_counter() - start)
    print(f"{ra.size} targets x {mjd.size} times = {values.size} values: {min(spent):.2f} s")


if __name__ == "__main__":
    main()
