"""What the failed trials of a layout fail for want of: each is repeated with one thing mended.

The same draws are used with a clear sky, with a tenth of the noise, with three times the visits,
and with seasons as long and as many as the sky allows. What mends a failed trial is its cause;
several share it. Noise counts as too little variability where the trial's drawn amplitude lay
below the forecast. Of what nothing mends, claims far from the truth are aliases; the rest is what
the method itself cannot do, or several wants together.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import numpy as np

from planner.model.campaign import Layout
from planner.model.observatory import WeatherClimate
from planner.model.plan import Cause
from planner.model.trial import FeedNights, Prospect, TrialTable
from planner.scoring import Job, Setting, by_year, normals_of

__all__ = ["CAUSE_TRIALS", "causes_of", "mended"]

CAUSE_TRIALS = 40
"""Trials that are looked into; all of them are repeated, for chunks of trials share their draws."""

QUIET = 0.1
DENSER = 3.0
ALIAS = 2.0
"""A claim off by more than so many times the tolerance is taken for an alias."""

WANTS = {
    "sky": "clear nights (weather made a gap or took epochs)",
    "noise": "signal-to-noise",
    "variability": "variability (the target was quieter than expected)",
    "epochs": "denser epochs",
    "season": "longer or more seasons",
    "alias": "a way to tell aliases apart",
    "method": "a better method, or several things at once",
}


def mended(setting: Setting, prospect: Prospect, layout: Layout, limit: float) -> dict[str, Job]:
    """Return the trials of a layout with one thing mended each, by what is mended.

    `limit` is the correlation that claims of the layout as it is had to exceed.
    """
    lit = replace(
        setting,
        climates=tuple((site, _always_clear(c)) for site, c in setting.climates),
        telescopes=tuple((name, site, 0.0) for name, site, _ in setting.telescopes),
    )
    quiet = replace(
        prospect,
        line=tuple(_quiet(n) for n in prospect.line),
        continuum=tuple(_quiet(n) for n in prospect.continuum),
    )
    denser = replace(
        layout,
        cadence_line_nights=max(1.0, layout.cadence_line_nights / DENSER),
        cadence_continuum_nights=max(1.0, layout.cadence_continuum_nights / DENSER),
    )
    longer = replace(
        layout,
        season_length_d=366.0,
        seasons=max(layout.seasons, len(by_year(prospect.seasons))),
        shift_d=0.0,
    )
    cases = {
        "sky": (lit, prospect, layout),
        "noise": (setting, quiet, layout),
        "epochs": (setting, prospect, denser),
        "season": (setting, prospect, longer),
    }
    return {name: Job(*case, CAUSE_TRIALS, limit=limit) for name, case in cases.items()}


def _always_clear(climate: WeatherClimate) -> WeatherClimate:
    return replace(climate, clear_fraction=(1.0,) * 12)


def _quiet(nights: FeedNights) -> FeedNights:
    return replace(
        nights, flux_error=nights.flux_error * QUIET, scale_error=nights.scale_error * QUIET
    )


def causes_of(
    setting: Setting,
    prospect: Prospect,
    layout: Layout,
    table: TrialTable,
    repeated: dict[str, TrialTable],
) -> tuple[Cause, ...]:
    """Return the causes of failure, commonest first.

    Parameters
    ----------
    setting, prospect, layout
        As they were tried.
    table : TrialTable
        The layout's trials.
    repeated : dict
        The same trials, mended; see `mended`.
    """
    at = table.layouts.index(layout)
    trials = min([int(table.trials[at]), *(int(t.trials[0]) for t in repeated.values())])
    failed = np.flatnonzero(~table.success[at, :trials])
    shares: Counter[str] = Counter()
    for trial in failed:
        healed = [name for name, t in repeated.items() if t.success[0, trial]]
        if "noise" in healed and normals_of(setting, prospect, int(trial))[1] < 0:
            healed[healed.index("noise")] = "variability"
        if not healed:
            off = abs(table.lag_d[at, trial] / table.lag_true_d[at, trial] - 1.0)
            wrong = table.claim[at, trial] and off > ALIAS * setting.success.within
            healed = ["alias" if wrong else "method"]
        for name in healed:
            shares[name] += 1.0 / len(healed) / failed.size  # type: ignore[assignment]
    ranked = sorted(shares.items(), key=lambda item: (-item[1], item[0]))
    return tuple(Cause(WANTS[name], float(share)) for name, share in ranked)
