"""Time of nights, windows and seasons, and the ratio to astroplan doing the same work.

Run as ``python tests/benchmarks/bench_sky.py``. astroplan finds the same windows in the way its
users do: twilights of every night from its `Observer`, then its constraints on a one-minute grid
between them. It runs on a few nights spread over the year and its time is scaled to the
whole, as printed; both sides answer to a minute or better.
"""

import resource
import time

import numpy as np
from astropy import units as u
from astropy.coordinates import SkyCoord
from astropy.time import Time

from planner.base.timescale import offline
from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.sky import constraints, nights_at, observer, seasons_of, windows_of

AIR = (WeatherClimate((1.0,) * 12, 2.0), SkyQuality(1.2, (), ()))

SITE = Site("here", -30.4, -70.9, 2300.0, None, *AIR)
LIMITS = Limits(2.0, -18.0, 30.0)
FIRST = 61465
ASTROPLAN_NIGHTS = 4


def targets(count):
    """Random targets over the whole sky, degrees."""
    rng = np.random.default_rng(3)
    return rng.uniform(0, 360, count), np.degrees(np.arcsin(rng.uniform(-1, 1, count)))


def ours(count, days):
    """Seconds for nights, windows and seasons, and the number of windows."""
    ra, dec = targets(count)
    start = time.perf_counter()
    nights = nights_at(SITE, FIRST, FIRST + days - 1, LIMITS)
    windows = windows_of(ra, dec, SITE, nights, LIMITS)
    seasons_of(windows, nights)
    return time.perf_counter() - start, windows.night.size


def astroplan(count, sample):
    """Seconds for astroplan's twilights and constraints of the nights in `sample`."""
    ra, dec = targets(count)
    coordinates = SkyCoord(ra * u.deg, dec * u.deg)
    with offline():
        start = time.perf_counter()
        for night in sample:
            there = observer(SITE)
            midnight = Time(night + 1.0 - SITE.longitude_deg / 360.0, format="mjd")
            dusk = there.twilight_evening_astronomical(midnight, which="previous")
            dawn = there.twilight_morning_astronomical(midnight, which="next")
            times = Time(np.arange(dusk.mjd, dawn.mjd, 1 / 1440), format="mjd")
            for rule in constraints(LIMITS):
                rule(there, coordinates, times=times, grid_times_targets=True)
        return time.perf_counter() - start


def main():
    """Print the table."""
    first, _ = ours(1, 10)
    print(f"first call, compile or read the kernel: {first:.2f} s")
    for count, days in ((20, 365), (1000, 1826)):
        spent, windows = min(ours(count, days) for _ in range(3))
        print(f"{count} targets x {days} nights: {spent:.2f} s, {windows} windows")
        if count == 20:
            sample = FIRST + np.arange(ASTROPLAN_NIGHTS) * (days // ASTROPLAN_NIGHTS)
            astroplan(count, sample[:1])
            seconds = astroplan(count, sample)
            whole = seconds / ASTROPLAN_NIGHTS * days
            print(
                f"  astroplan: {seconds:.1f} s for {ASTROPLAN_NIGHTS} nights, so {whole:.0f} s "
                f"for all (scaled): ratio {whole / spent:.0f}"
            )
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
    print(f"peak memory of this process: {peak:.2f} GB")


if __name__ == "__main__":
    main()
