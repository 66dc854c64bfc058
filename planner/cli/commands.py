"""What each command does; every function takes the parsed options and returns an exit status."""

from __future__ import annotations

import json
import sys
from argparse import Namespace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from planner.base.errors import InputError
from planner.base.files import claim_folder
from planner.cli.terminal import ProgressLine, significant, table_text

if TYPE_CHECKING:
    from astropy.table import Table

    from planner.campaign import Reading
    from planner.scoring import Store

__all__ = ["check", "compare", "lags", "nights", "plan", "recover", "schedule", "score", "start"]

CAUTION = (
    "A plan is no permission: the observatory's own limits, sun avoidance, safety rules "
    "and staff decide."
)
WORK_FILE = ".trials.sqlite"
OWN_LAGS, OWN_RESAMPLES = 961, 1000
"""Trial lags and resamples for an observer's own curves, which are recovered but once."""


def _say(text: str) -> None:
    sys.stdout.write(text + "\n")


def _say_json(result: dict[str, Any]) -> None:
    _say(json.dumps(result, ensure_ascii=False))


def _read(options: Namespace) -> Reading:
    from planner import pipeline

    return pipeline.read(options.file, options.seed)


def _claim(options: Namespace, reading: Reading) -> Path | None:
    """Make the output folder ours, where one is asked for."""
    if options.out is None:
        return None
    from planner.base.provenance import planner_version
    from planner.scoring import key_of

    claim_folder(
        options.out,
        key_of(options.command, planner_version(), reading.campaign),
        replace=options.replace,
    )
    return Path(options.out)


def _store(folder: Path | None) -> Store:
    from planner.scoring import Store

    return Store(None if folder is None else folder / WORK_FILE)


def check(options: Namespace) -> int:
    """Read and validate a campaign file and print what was understood."""
    from planner.campaign import as_dict, describe

    reading = _read(options)
    if options.json:
        _say_json(as_dict(reading))
    else:
        _say(describe(reading))
    return 0


def lags(options: Namespace) -> int:
    """Print each target's expected lag."""
    from planner import export, pipeline

    reading = _read(options)
    folder = _claim(options, reading)
    forecasts = pipeline.forecast_targets(reading.campaign)
    if _give(options, folder, {"lags": export.lags_table(forecasts)}):
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
    _say(
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
    return 0


def nights(options: Namespace) -> int:
    """Print each target's seasons and the nights left after weather."""
    from planner import export, pipeline
    from planner.base.timescale import date_of_night
    from planner.weather import expected_clear

    reading = _read(options)
    campaign = reading.campaign
    folder = _claim(options, reading)
    forecasts = pipeline.forecast_targets(campaign)
    skies = pipeline.observe_sky(campaign)
    prospects = pipeline.prospects_of(campaign, forecasts, skies)
    tables = {
        "windows": export.windows_table([t.name for t in campaign.targets], skies),
        "seasons": export.seasons_table(campaign, prospects),
    }
    if _give(options, folder, tables):
        return 0
    climate = campaign.site_of(campaign.line).weather
    rows = []
    for p in prospects:
        for s in p.seasons:
            inside = (p.line.night >= s.first) & (p.line.night <= s.last)
            dates = campaign.first_night + p.line.night[inside]
            hours = (p.line.window_end_mjd - p.line.window_start_mjd)[inside] * 24
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
    _say(
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


def score(options: Namespace) -> int:
    """Print every layout's chance of success for every target."""
    from planner import export, pipeline

    reading = _read(options)
    campaign = reading.campaign
    folder = _claim(options, reading)
    prospects = pipeline.prospects_of(
        campaign, pipeline.forecast_targets(campaign), pipeline.observe_sky(campaign)
    )
    _, scores = pipeline.score_all(
        campaign,
        prospects,
        workers=options.workers,
        store=_store(folder),
        progress=ProgressLine(quiet=options.quiet),
    )
    flat = [s for of_target in scores for s in of_target]
    if _give(options, folder, {"scores": export.scores_table(flat)}):
        return 0
    rows = [
        [
            s.target,
            f"{s.layout.cadence_line_nights:g}",
            f"{s.layout.cadence_continuum_nights:g}",
            f"{s.layout.seasons} × {s.layout.season_length_d:g} d",
            f"{s.epochs_line:.0f}",
            *(
                [
                    f"{s.success:.0%}",
                    f"{s.success_lo:.0%}–{s.success_hi:.0%}",
                    f"{s.false_claims:.0%}",
                    f"{s.hours:.0f}",
                ]
                if s.trials
                else ["–"] * 4
            ),
            s.note,
        ]
        for s in flat
    ]
    _say(
        table_text(
            [
                "target",
                "spectra every [n]",
                "imaging every [n]",
                "seasons",
                "spectra",
                "success",
                "90 % bounds",
                "wrong",
                "hours",
                "note",
            ],
            rows,
        )
    )
    return 0


def schedule(options: Namespace) -> int:
    """Print the night-by-night schedule of all targets."""
    from planner import export, pipeline

    reading = _read(options)
    folder = _claim(options, reading)
    made = pipeline.make_plan(
        reading,
        workers=options.workers,
        store=_store(folder),
        progress=ProgressLine(quiet=options.quiet),
    )
    table = export.schedule_table(made.campaign, made.visits)
    if folder is not None:
        export.write_csv(table, folder / "schedule.csv")
    if _give(options, folder, {"schedule": table}):
        return 0
    _say(
        table_text(
            ["night", "start [UTC]", "end [UTC]", "telescope", "target", "stream", "airmass"],
            [
                [
                    str(v["night"]),
                    str(v["start_utc"]),
                    str(v["end_utc"]),
                    str(v["telescope"]),
                    str(v["target"]),
                    str(v["stream"]),
                    f"{v['airmass']:.2f}",
                ]
                for v in table
            ],
        )
    )
    _say("\n" + CAUTION)
    return 0


def plan(options: Namespace) -> int:
    """Do the main job into one folder."""
    from planner import export, pipeline

    reading = _read(options)
    if options.out is None:
        options.out = Path(f"{options.file.stem}-plan")
    folder = _claim(options, reading)
    assert folder is not None
    store = _store(folder)
    try:
        made = pipeline.make_plan(
            reading,
            workers=options.workers,
            store=store,
            progress=ProgressLine(quiet=options.quiet),
        )
        pipeline.write_plan(made, reading, folder)
    finally:
        store.close()
    table = export.recommendation_table(made.recommendations, made.executed)
    if options.json:
        _say_json({"folder": str(folder), "recommendation": export.as_rows(table)})
        return 0
    rows = []
    for r in made.recommendations:
        s, kept = r.score, made.executed.get(r.target)
        if s is None:
            rows.append([r.target, r.decision, *["–"] * 7])
            continue
        rows.append(
            [
                r.target,
                r.decision,
                f"{s.layout.cadence_line_nights:g}",
                f"{s.layout.cadence_continuum_nights:g}",
                f"{s.layout.seasons} × {s.layout.season_length_d:g} d",
                f"{s.success:.0%}",
                f"{s.success_lo:.0%}–{s.success_hi:.0%}",
                "–" if kept is None else f"{kept.success:.0%}",
                f"{s.hours:.0f}",
            ]
        )
    _say(
        table_text(
            [
                "target",
                "decision",
                "spectra every [n]",
                "imaging every [n]",
                "seasons",
                "success",
                "90 % bounds",
                "in the schedule",
                "hours",
            ],
            rows,
        )
    )
    for r in made.recommendations:
        _say(f"\n{r.target}: {r.why}.")
    _say(f"\n{len(made.visits)} visits scheduled; everything stands in {folder}/report.html")
    _say(CAUTION)
    return 0


def compare(options: Namespace) -> int:
    """Print scenarios side by side."""
    from planner import pipeline
    from planner.compare import Scenario, compare_scenarios

    if len(options.files) < 2:
        raise InputError("compare: found one file; expected two or more campaign files")
    readings = [pipeline.read(path, options.seed) for path in options.files]
    scenarios = []
    for path, reading in zip(options.files, readings, strict=True):
        campaign = reading.campaign
        forecasts = pipeline.forecast_targets(campaign)
        prospects = pipeline.prospects_of(campaign, forecasts, pipeline.observe_sky(campaign))
        work = {
            "workers": options.workers,
            "store": _store(None),
            "progress": ProgressLine(quiet=options.quiet),
        }
        tables, scores = pipeline.score_all(campaign, prospects, **work)
        advice = pipeline.recommend_all(campaign, forecasts, tables, scores, **work)
        scenarios.append(Scenario(path.stem, tables, advice))
    results = compare_scenarios(scenarios)
    if options.json:
        from dataclasses import asdict

        _say_json({"scenarios": [asdict(r) for r in results]})
        return 0
    rows = [
        [
            r.name,
            f"{r.goal_met}/{r.targets}",
            f"{r.hours:.0f}",
            f"{r.lags:.1f}",
            f"{r.lags_lo:.0f}–{r.lags_hi:.0f}",
            f"{r.wrong_claims:.1f}",
            "" if i == 0 else f"{r.gain:+.2f} ({r.gain_lo:+.2f} to {r.gain_hi:+.2f})",
            "" if i == 0 else "yes" if r.told_apart else "cannot be told apart",
        ]
        for i, r in enumerate(results)
    ]
    _say(
        table_text(
            [
                "scenario",
                "goal met",
                "hours",
                "lags",
                "10–90 %",
                "wrong",
                f"lags more than {results[0].name}",
                "difference sure",
            ],
            rows,
        )
    )
    return 0


def recover(options: Namespace) -> int:
    """Print the lag of an observer's own two light curves."""
    import numpy as np

    from planner.base.seeds import stream
    from planner.campaign import read_light_curve
    from planner.recovery import lag_grid, recover_lag, search_range

    continuum, line = read_light_curve(options.continuum), read_light_curve(options.line)
    times = np.concatenate([continuum.time_d, line.time_d])
    duration = float(np.ptp(times))
    if duration == 0:
        raise InputError(f"{options.continuum}: all epochs of both curves are at one time")
    # Nothing is known of this AGN, so every lag is searched that leaves a third of the data.
    grid = lag_grid(*search_range(duration, duration, 2 * duration), 1.0, OWN_LAGS)
    result = recover_lag(
        *continuum, *line, grid, OWN_RESAMPLES, stream(options.seed or 0, "recover")
    )
    if options.json:
        names = ("lag_d", "lag_lo_d", "lag_hi_d", "r_max", "peak_d", "share")
        values = {name: float(getattr(result, name)) for name in names}
        finite = {name: value if np.isfinite(value) else None for name, value in values.items()}
        _say_json(finite | {"reason": result.reason})
    elif result.reason:
        _say(f"no lag: {result.reason}")
    else:
        _say(
            f"lag {significant(result.lag_d, 3)} d, 68 % interval "
            f"{significant(result.lag_lo_d, 3)} to {significant(result.lag_hi_d, 3)} d "
            f"(observed frame), peak correlation {result.r_max:.2f}"
        )
    return 0


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
    _say(f"Wrote {folder}/campaign.yaml and {folder}/targets.yaml; edit them, then:")
    _say(f"  planner check {folder}/campaign.yaml")
    return 0


def _give(options: Namespace, folder: Path | None, tables: dict[str, Table]) -> bool:
    """Write tables to the folder and print them as JSON, where asked; say whether printed."""
    from planner import export

    if folder is not None:
        for name, table in tables.items():
            export.write_ecsv(table, folder / f"{name}.ecsv")
    if options.json:
        _say_json({name: export.as_rows(table) for name, table in tables.items()})
        return True
    return False
