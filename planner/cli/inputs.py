"""Commands that need no trials: start, check, lags, nights."""

from __future__ import annotations

from argparse import Namespace
from pathlib import Path
from typing import TYPE_CHECKING

from planner.base.errors import InputError
from planner.cli.shared import claim, give, read, say, say_json
from planner.cli.terminal import significant, table_text

if TYPE_CHECKING:
    from astropy.table import Table

__all__ = ["check", "lags", "nights", "start", "trace"]


MANY = 100
"""Targets beyond which a check does not look at the sky, so that it stays quick."""


def start(options: Namespace) -> int:
    """Write a commented campaign file and target list."""
    from importlib.resources import files

    from planner.base.files import write_bytes

    folder: Path = options.folder
    template = files("planner.cli") / "template"
    names = ("campaign.yaml", "targets.yaml")
    for name in names:
        if (folder / name).exists():
            raise InputError(f"{folder / name}: exists already; name another folder")
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise InputError(f"{folder}: cannot be made: {error.strerror}") from error
    for name in names:
        write_bytes(folder / name, (template / name).read_bytes())
    say(f"Wrote {folder}/campaign.yaml and {folder}/targets.yaml; edit them, then:")
    say(f"  planner check {folder}/campaign.yaml")
    return 0


def check(options: Namespace) -> int:
    """Read and validate a campaign file and print what was understood."""
    from planner import export, pipeline
    from planner.campaign import as_dict, describe

    reading = read(options)
    if options.json:
        say_json(as_dict(reading))
        return 0
    say(describe(reading))
    campaign = reading.campaign
    if len(campaign.targets) > MANY:
        say(f"More than {MANY} targets: `planner lags` tells what one epoch of each measures")
        return 0
    prospects = pipeline.prospects_of(
        campaign, pipeline.forecast_targets(campaign), pipeline.observe_sky(campaign)
    )
    say("One epoch, at the median conditions of the season")
    say(_epochs_text(export.epochs_table(prospects)))
    return 0


def lags(options: Namespace) -> int:
    """Print each target's expected lag."""
    from planner import export, pipeline

    reading = read(options)
    folder = claim(options, reading)
    forecasts = pipeline.forecast_targets(reading.campaign)
    prospects = pipeline.prospects_of(
        reading.campaign, forecasts, pipeline.observe_sky(reading.campaign)
    )
    epochs = export.epochs_table(prospects)
    if give(options, folder, {"lags": export.lags_table(forecasts), "epochs": epochs}):
        return 0
    rows = []
    for f in forecasts:
        spread = 10**f.lag_scatter_dex
        rows.append(
            [
                f.name,
                f.line,
                significant(f.lag_rest_d),
                significant(f.lag_obs_d),
                f"{significant(f.lag_obs_d / spread)}–{significant(f.lag_obs_d * spread)}",
                f.relation + (" (outside its range)" if f.outside_range else ""),
                f"{f.log_luminosity:.2f}",
                f"{f.log_mass:.1f}",
                f"{f.mass_dex:.2f}",
            ]
        )
    say(
        table_text(
            [
                "target",
                "line",
                "lag rest [d]",
                "lag observed [d]",
                "68 % range [d]",
                "relation",
                "log L [erg/s]",
                "log mass [suns]",
                "mass error [dex]",
            ],
            rows,
        )
    )
    say("\nOne epoch, at the median conditions of the season:")
    say(_epochs_text(epochs))
    return 0


def _epochs_text(table: Table) -> str:
    """Return what one visit measures as a text table."""
    return table_text(
        [
            "target",
            "stream",
            "telescope",
            "exposure [s]",
            "S/N",
            "flux error [%]",
            "visit [h]",
            "airmass",
            "sky [mag/arcsec2]",
            "note",
        ],
        [
            [
                str(row["target"]),
                str(row["stream"]),
                str(row["telescope"]),
                f"{row['exposure']:.0f}",
                significant(row["signal_to_noise"], 3),
                significant(100 * row["flux_error"], 2),
                f"{row['visit']:.2f}",
                f"{row['airmass']:.2f}" if row["nights"] else "–",
                f"{row['sky']:.1f}" if row["nights"] else "–",
                str(row["note"]) if row["nights"] else "no window holds a visit",
            ]
            for row in table
        ],
    )


def trace(options: Namespace) -> int:
    """Print how each number of one target came about."""
    from dataclasses import replace

    from planner import pipeline, report

    campaign = read(options).campaign
    found = next((t for t in campaign.targets if t.name == options.target), None)
    if found is None:
        known = ", ".join(t.name for t in campaign.targets)
        raise InputError(f"{options.file}: no target {options.target}; expected one of {known}")
    alone = replace(campaign, targets=(found,))
    (prospect,) = pipeline.prospects_of(
        alone, pipeline.forecast_targets(alone), pipeline.observe_sky(alone)
    )
    sections = report.trace(alone, found, prospect)
    if options.json:
        say_json({title: [s._asdict() for s in steps] for title, steps in sections.items()})
        return 0
    say(f"{found.name}, z = {found.redshift:g}")
    for title, steps in sections.items():
        say(f"\n{title}")
        for step in steps:
            say(f"  {step.what}: {step.value} ({step.how})")
    return 0


def nights(options: Namespace) -> int:
    """Print each target's seasons and the nights left after weather."""
    from planner import export, pipeline
    from planner.base.timescale import date_of_night
    from planner.weather import expected_clear

    reading = read(options)
    campaign = reading.campaign
    folder = claim(options, reading)
    forecasts = pipeline.forecast_targets(campaign)
    skies = pipeline.observe_sky(campaign)
    prospects = pipeline.prospects_of(campaign, forecasts, skies)
    tables = {
        "windows": export.windows_table([t.name for t in campaign.targets], skies),
        "seasons": export.seasons_table(campaign, prospects),
    }
    if give(options, folder, tables):
        return 0
    climate = campaign.site(campaign.line.feeds[0].telescope).weather
    rows = []
    for p in prospects:
        for s in p.seasons:
            on_offer = p.line[0]
            inside = (on_offer.night >= s.first) & (on_offer.night <= s.last)
            dates = campaign.first_night + on_offer.night[inside]
            hours = (on_offer.window_end_mjd - on_offer.window_start_mjd)[inside] * 24
            first, last = (date_of_night(campaign.first_night + n) for n in (s.first, s.last))
            rows.append(
                [
                    p.forecast.name,
                    first,
                    last,
                    str(s.nights),
                    f"{expected_clear(climate, dates).sum():.0f}",
                    f"{hours.mean():.1f}",
                    str(s.gap_after_nights),
                ]
            )
        if not p.seasons:
            rows.append([p.forecast.name, "–", "–", "0", "0", "–", "–"])
    say(
        table_text(
            [
                "target",
                "first night",
                "last night",
                "nights",
                "clear nights",
                "hours a night",
                "gap after [d]",
            ],
            rows,
        )
    )
    return 0
