"""Information forecast of a whole survey; run as ``python bench_survey.py [TARGETS ...]``.

Invented targets, 60 layouts each, 2 worker processes. Prints for each survey the seconds of each
stage, those for each target, the largest process's peak memory, and what 1000 targets would take at
the same pace. Without an argument: 10, 50 and 200 targets. Starting the workers is counted in.
"""

import itertools
import resource
import sys
import tempfile
import time
from pathlib import Path

from invented import write_campaign

from planner import pipeline
from planner.model.campaign import Layout
from planner.scoring import observe_sky, setting_of
from planner.scoring.forecasting import forecast_layouts

SPECTRA, IMAGING, LENGTHS_D, SEASONS = (2, 3, 5, 8, 12), 2, (60, 90, 120, 150, 180, 240), (1, 2)
LAYOUTS = tuple(
    Layout(spectra, IMAGING, length, seasons)
    for spectra, length, seasons in itertools.product(SPECTRA, LENGTHS_D, SEASONS)
)
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
        campaign = pipeline.read(write_campaign(Path(folder) / "survey.yaml", targets)).campaign
    lap("reading")
    expected = pipeline.forecast_targets(campaign)
    lap("AGN")
    skies = observe_sky(campaign)
    lap("sky")
    prospects = pipeline.prospects_of(campaign, expected, skies)
    lap("prospects")
    before = cpu_s()
    found = forecast_layouts(
        setting_of(campaign), prospects, LAYOUTS, workers=WORKERS, progress=lambda *_: None
    )
    lap("forecast")
    total = sum(spent.values())
    hopeful = sum(f.success >= campaign.success.goal for f in found)
    print(f"{targets} targets x {len(LAYOUTS)} layouts, {WORKERS} workers")
    for stage, seconds in spent.items():
        each = 1e3 * seconds / targets
        print(f"  {stage:10s} {seconds:8.1f} s  {each:8.1f} ms a target  {seconds / total:4.0%}")
    layout_ms = 1e3 * (cpu_s() - before) / len(found)
    print(f"  all        {total:8.1f} s  {1e3 * total / targets:8.1f} ms a target")
    print(f"  one layout {layout_ms:.1f} ms of processor time; {hopeful} layouts reach the goal")
    print(f"  peak memory {peak_mb():.0f} MB; 1000 targets {1000 * total / targets / 60:.1f} min")


if __name__ == "__main__":
    for number in sys.argv[1:] or ("10", "50", "200"):
        survey(int(number))
