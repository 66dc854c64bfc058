"""Information forecast of a whole survey; run as ``python bench_survey.py [TARGETS ...]``.

Invented targets, 60 layouts each, 2 worker processes. Prints for each survey the seconds of each
stage, those for each target, the largest process's peak memory, and what 1000 targets would take at
the same pace. Without an argument: 10, 50 and 200 targets. Starting the workers is counted in.
"""

import resource
import sys
import tempfile
import time
from pathlib import Path

from invented import write_campaign

from planner import pipeline
from planner.base.workers import Workers
from planner.scoring import Store, Tools, forecast_offers, observe_sky, setting_of

CANDIDATES = {
    "spectra": "[2 nights, 3 nights, 5 nights, 8 nights, 12 nights]",
    "imaging": "2 nights",
    "lengths": "[60 d, 90 d, 120 d, 150 d, 180 d, 240 d]",
    "seasons": "[1, 2]",
}
LAYOUTS = 60
WORKERS = 2


def peak_mb():
    """Return the peak memory of the largest process so far, this one or a worker."""
    who = (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)
    return max(resource.getrusage(one).ru_maxrss for one in who) / 1024


def cpu_s():
    """Return the processor's seconds so far of this process and its finished workers."""
    used = [resource.getrusage(w) for w in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)]
    return sum(one.ru_utime + one.ru_stime for one in used)


def survey(targets):
    """Forecast a survey; print its figures."""
    spent = {}
    start = time.perf_counter()

    def lap(stage):
        nonlocal start
        spent[stage], start = time.perf_counter() - start, time.perf_counter()

    with tempfile.TemporaryDirectory() as folder:
        file = write_campaign(Path(folder) / "survey.yaml", targets, **CANDIDATES)
        campaign = pipeline.read(file).campaign
        lap("reading")
        expected = pipeline.forecast_targets(campaign)
        lap("AGN")
        skies = observe_sky(campaign)
        lap("sky")
        offers = pipeline.offers_of(campaign, expected, skies)
        lap("prospects")
        before = cpu_s()
        kept = Path(folder) / "kept"
        with Workers(WORKERS) as workers:
            tools = Tools(workers, Store(kept), lambda *_: None)
            by_target = forecast_offers(setting_of(campaign), offers, tools)
        lap("forecast")
        tools.store.close()
        kept_mb = kept.stat().st_size / 1e6
    found = [f for mine in by_target for f in mine]
    assert len(found) == targets * LAYOUTS
    total = sum(spent.values())
    hopeful = sum(f.success >= campaign.success.goal for f in found)
    print(f"{targets} targets x {LAYOUTS} layouts, {WORKERS} workers")
    for stage, seconds in spent.items():
        each = 1e3 * seconds / targets
        print(f"  {stage:10s} {seconds:8.1f} s  {each:8.1f} ms a target  {seconds / total:4.0%}")
    layout_ms = 1e3 * (cpu_s() - before) / len(found)
    print(f"  all        {total:8.1f} s  {1e3 * total / targets:8.1f} ms a target")
    print(f"  one layout {layout_ms:.1f} ms of processor time; {hopeful} layouts reach the goal")
    print(f"  peak memory {peak_mb():.0f} MB, store {kept_mb:.1f} MB")
    print(f"  1000 targets: {1000 * total / targets / 60:.1f} min")


if __name__ == "__main__":
    for number in sys.argv[1:] or ("10", "50", "200"):
        survey(int(number))
