"""False claims and coverage of both methods in five kinds of campaign.

Run as ``python tests/statistical/recovery_cases.py [TRIALS]`` to print the tables; 300 trials of
each case take some minutes on two cores.
"""

import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
from scipy.stats import beta

from planner.base.workers import Workers
from planner.campaign.cuts import cuts_named
from planner.model.campaign import Layout, SuccessRule
from planner.model.sky import Season
from planner.scoring import Job, Store, Tools, score_jobs, setting_of

USUAL = cuts_named("usual")
ANY_LAG = SuccessRule(0.8, 0.3, np.inf, 0.0, -1e9)
"""Every lag is a claim, however wide its interval."""

# Layout, median lag in days, errors of continuum and line (fractions of the flux; the rms of the
# continuum is 0.11, of the line before smoothing 0.15).
CASES = {
    "dense": (Layout(3.0, 1.0, 160.0, 1), 20.0, 0.006, 0.015),
    "sparse": (Layout(10.0, 5.0, 160.0, 1), 20.0, 0.011, 0.022),
    "two seasons": (Layout(4.0, 2.0, 120.0, 2), 60.0, 0.009, 0.018),
    "noisy": (Layout(3.0, 1.0, 160.0, 1), 20.0, 0.055, 0.100),
    "short": (Layout(2.0, 1.0, 60.0, 1), 12.0, 0.009, 0.018),
}
YEAR_D = 365


def job_of(case, campaign, prospect, method, trials, resamples=100, rule=USUAL, unrelated=False):
    """Return the trials of one case: timescale 60 d within 0.3 dex, a quarter of nights lost."""
    layout, lag_d, error1, error2 = CASES[case]
    length, seasons = int(layout.season_length_d), layout.seasons
    night = np.concatenate([np.arange(length) + YEAR_D * s for s in range(seasons)])
    visible = tuple(
        Season(i, YEAR_D * i, YEAR_D * i + length - 1, length, 0) for i in range(seasons)
    )
    forecast = replace(
        prospect.forecast, lag_obs_d=lag_d, timescale_obs_d=60.0, timescale_scatter_dex=0.3
    )
    line, continuum = (
        replace(
            feed,
            night=night,
            best_mjd=feed.best_mjd[0] + night,
            window_start_mjd=feed.window_start_mjd[0] + night,
            window_end_mjd=feed.window_end_mjd[0] + night,
            airmass=np.full(night.size, 1.1),
            sky_ab_mag=np.full(night.size, 21.5),
            signal_to_noise=np.full(night.size, 50.0),
            flux_error=np.full(night.size, error),
        )
        for feed, error in ((prospect.line[0], error2), (prospect.continuum[0], error1))
    )
    simulation = replace(campaign.simulation, trials=trials, resamples=resamples, method=method)
    setting = replace(
        setting_of(campaign),
        seed=1 + list(CASES).index(case),
        nights=int(night[-1]) + 1,
        simulation=simulation,
        success=rule,
        unrelated=unrelated,
    )
    case_prospect = replace(
        prospect, forecast=forecast, line=(line,), continuum=(continuum,), seasons=visible
    )
    return Job(setting, case_prospect, layout, trials)


def run(jobs, workers=1):
    """Return the tables of jobs."""
    with Workers(workers) as processes:
        return score_jobs(jobs, Tools(processes, Store(None), lambda *_: None), "trials")


def inside(table):
    """Return, for each trial with a lag, whether its 68 % interval holds the truth."""
    known = np.isfinite(table.lag_d)
    held = (table.lag_lo_d <= table.lag_true_d) & (table.lag_true_d <= table.lag_hi_d)
    return held[known], table.claim[known]


def interval(hits, trials):
    """Return the exact central 95 % interval of a share (Clopper & Pearson 1934)."""
    lo = beta.ppf(0.025, hits, trials - hits + 1) if hits else 0.0
    hi = beta.ppf(0.975, hits + 1, trials - hits) if hits < trials else 1.0
    return lo, hi


def words(hits, trials):
    """Return a share, its interval and the number of trials as text."""
    if trials == 0:
        return "      none       "
    lo, hi = interval(hits, trials)
    return f"{hits / trials:.3f} [{lo:.3f}, {hi:.3f}] {trials:4d}"


def print_false_claims(campaign, prospect, trials):
    print("Claims on unrelated lines, usual cuts: share [95 %] trials")
    for method in ("correlation", "likelihood"):
        jobs = [job_of(c, campaign, prospect, method, trials, unrelated=True) for c in CASES]
        tables = run(jobs, workers=2)
        claims = [int(t.claim.sum()) for t in tables]
        for case, count in zip(CASES, claims, strict=True):
            print(f"{method:12s} {case:12s} {words(count, trials)}", flush=True)
        print(f"{method:12s} {'all':12s} {words(sum(claims), trials * len(CASES))}", flush=True)


def print_coverage(campaign, prospect, trials):
    print(
        "Truth inside the 68 % interval: every lag; claims by the usual cuts: share [95 %] trials"
    )
    for method in ("correlation", "likelihood"):
        for rule in (ANY_LAG, USUAL):
            jobs = [job_of(c, campaign, prospect, method, trials, 300, rule) for c in CASES]
            for case, table in zip(CASES, run(jobs, workers=2), strict=True):
                held, claim = inside(table)
                which = held if rule is ANY_LAG else held[claim]
                right = int(table.success.sum())
                name = "every lag" if rule is ANY_LAG else "claims"
                print(
                    f"{method:12s} {case:12s} {name:10s} {words(int(which.sum()), which.size)}"
                    f"  right {words(right, which.size)}",
                    flush=True,
                )


def main(trials=300):
    sys.path.insert(0, str(Path(__file__).parents[1]))
    import conftest

    def plain(fixture):
        return fixture.__wrapped__

    campaign = plain(conftest.campaign)(plain(conftest.site)())
    nights = plain(conftest.nights)()
    prospect = plain(conftest.prospect)(plain(conftest.forecast)(), nights)
    print_false_claims(campaign, prospect, trials)
    print_coverage(campaign, prospect, trials)


if __name__ == "__main__":
    main(*(int(argument) for argument in sys.argv[1:]))
