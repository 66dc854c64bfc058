"""What a spectrum's scale error does to lags when the continuum comes from the same spectra.

Run as ``python tests/statistical/shared_scale.py`` to draw the figure beside this file.
"""

from dataclasses import replace
from pathlib import Path

import numpy as np

from planner.model.campaign import Layout
from planner.scoring import place_in
from planner.scoring.draws import draw_trial
from planner.scoring.recovering import by_correlation
from planner.scoring.trials import nights_used, observe

SCALE_ERROR = 0.05
TRIALS = 60
LAYOUT = Layout(2.0, 2.0, 180.0, 1)


def peaks(setting, prospect, source, trials=TRIALS):
    """Return the lags of the correlation's peaks in days and the true lags, trial by trial.

    The same truth is seen in both cases: continuum from the line's own spectra, whose scale errors
    it shares, or from a second telescope's images.
    """
    forecast = replace(
        prospect.forecast, lag_obs_d=20.0, lag_scatter_dex=0.0, amplitude_mag=0.12,
        timescale_obs_d=80.0,
    )  # fmt: skip
    line = prospect.line[0]
    error = np.hypot(0.01, SCALE_ERROR)
    line = replace(line, flux_error=np.full(line.night.size, error), scale_error=SCALE_ERROR)
    continuum = (
        replace(line, in_spectra_of=0, visit_s=0.0, exposure_s=0.0)
        if source == "spectra"
        else replace(prospect.continuum[0], flux_error=np.full(line.night.size, 0.01))
    )
    case = replace(prospect, forecast=forecast, line=(line,), continuum=(continuum,))
    placing = place_in(case, LAYOUT)
    span = float(placing.last[-1] - placing.first[0])
    setting = replace(setting, simulation=replace(setting.simulation, resamples=10))
    found = []
    for trial in range(trials):
        draw = draw_trial(setting, case, trial)
        curves = observe(case, draw, nights_used(case, LAYOUT, placing, draw.usable))
        result = by_correlation(setting, case, curves, span, "figure", trial)
        found.append((result.peak_d, draw.lag_obs_d))
    return np.array(found).T


def main():
    import sys

    from matplotlib.figure import Figure

    sys.path.insert(0, str(Path(__file__).parents[1]))
    import conftest

    made = _fixtures(conftest)
    figure = Figure(figsize=(6, 3.4), layout="constrained")
    ax = figure.subplots()
    for source, colour, words in (
        ("spectra", "#D55E00", "continuum from the same spectra"),
        ("imaging", "#0072B2", "continuum from a second telescope"),
    ):
        lags, _ = peaks(*made, source, 300)
        ax.hist(lags, np.arange(-40, 81, 2), histtype="step", lw=2, color=colour, label=words)
    ax.axvline(20, color="#009E73", ls="--", label="true lag")
    ax.set_xlabel("lag of the correlation's peak [d]")
    ax.set_ylabel("trials of 300")
    ax.set_title(f"Spectra with a scale error of {SCALE_ERROR:.0%} a night", fontsize=10)
    ax.legend(frameon=False)
    figure.savefig(Path(__file__).with_suffix(".png"), dpi=125)


def _fixtures(conftest):
    """Return setting and prospect as the tests make them."""
    from planner.scoring import setting_of

    def plain(fixture):
        return fixture.__wrapped__ if hasattr(fixture, "__wrapped__") else fixture

    nights = plain(conftest.nights)()
    campaign = plain(conftest.campaign)(plain(conftest.site)())
    return setting_of(campaign), plain(conftest.prospect)(plain(conftest.forecast)(), nights)


if __name__ == "__main__":
    main()
