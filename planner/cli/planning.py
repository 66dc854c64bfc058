"""Commands that run trials: score, schedule, plan, compare."""

from __future__ import annotations

from argparse import Namespace
from pathlib import Path
from typing import TYPE_CHECKING

from planner.base.errors import InputError
from planner.cli.shared import CAUTION, claim, give, read, say, say_json, store_in
from planner.cli.terminal import ProgressLine, table_text

if TYPE_CHECKING:
    from collections.abc import Sequence

    from planner.model.campaign import Campaign
    from planner.model.trial import Prospect

__all__ = ["compare", "plan", "schedule", "score"]


def score(options: Namespace) -> int:
    """Print every layout's chance of success for every target."""
    from planner import export, pipeline

    reading = read(options)
    campaign = reading.campaign
    folder = claim(options, reading)
    prospects = pipeline.prospects_of(
        campaign, pipeline.forecast_targets(campaign), pipeline.observe_sky(campaign)
    )
    if options.forecast:
        return _forecast(options, campaign, prospects, folder)
    _, scores = pipeline.score_all(
        campaign,
        prospects,
        workers=options.workers,
        store=store_in(folder),
        progress=ProgressLine(quiet=options.quiet),
    )
    flat = [s for of_target in scores for s in of_target]
    if give(options, folder, {"scores": export.scores_table(flat)}):
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
    say(
        table_text(
            [
                "target",
                "nights per spectrum",
                "per image",
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


def _forecast(
    options: Namespace, campaign: Campaign, prospects: Sequence[Prospect], folder: Path | None
) -> int:
    """Print the layouts of each target ranked by their information forecast."""
    from planner import export
    from planner.scoring import forecast_layouts, setting_of

    forecasts = forecast_layouts(
        setting_of(campaign),
        prospects,
        campaign.layouts(),
        workers=options.workers,
        progress=ProgressLine(quiet=options.quiet),
    )
    if give(options, folder, {"forecast": export.forecast_table(forecasts)}):
        return 0
    say(
        table_text(
            [
                "target",
                "nights per spectrum",
                "per image",
                "seasons",
                "expected success",
                "least error",
            ],
            [
                [
                    f.target,
                    f"{f.layout.cadence_line_nights:g}",
                    f"{f.layout.cadence_continuum_nights:g}",
                    f"{f.layout.seasons} × {f.layout.season_length_d:g} d",
                    f"{f.success:.0%}",
                    f"{f.error:.0%}" if f.error < 10 else "–",
                ]
                for f in forecasts
            ],
        )
    )
    say(
        "\nExpected success of a likelihood recovery that knows variability and response; trials "
        "fall short of it."
    )
    return 0


def schedule(options: Namespace) -> int:
    """Print the night-by-night schedule of all targets."""
    from planner import export, pipeline

    reading = read(options)
    folder = claim(options, reading)
    made = pipeline.make_plan(
        reading,
        workers=options.workers,
        store=store_in(folder),
        progress=ProgressLine(quiet=options.quiet),
    )
    table = export.schedule_table(made.campaign, made.visits)
    if folder is not None:
        export.write_csv(table, folder / "schedule.csv")
    if give(options, folder, {"schedule": table}):
        return 0
    say(
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
    say("\n" + CAUTION)
    return 0


def plan(options: Namespace) -> int:
    """Do the main job into one folder."""
    from planner import export, pipeline
    from planner.writing import write_plan

    reading = read(options)
    if options.out is None:
        options.out = Path(f"{options.file.stem}-plan")
    folder = claim(options, reading)
    assert folder is not None
    store = store_in(folder)
    try:
        made = pipeline.make_plan(
            reading,
            workers=options.workers,
            store=store,
            progress=ProgressLine(quiet=options.quiet),
        )
        write_plan(made, reading, folder)
    finally:
        store.close()
    table = export.recommendation_table(made)
    if options.json:
        say_json({"folder": str(folder), "recommendation": export.as_rows(table)})
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
    say(
        table_text(
            [
                "target",
                "decision",
                "nights per spectrum",
                "per image",
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
        say(f"\n{r.target}: {r.why}.")
    missing = sum(u.wanted - u.placed for u in made.unplaced)
    if missing:
        say(f"\n{missing} wanted visits find no room in the telescopes' time; see the report")
    clock = sum(t.clock_hours for t in made.time_spent)
    say(
        f"\n{len(made.visits)} visits scheduled, {clock:.0f} clock hours if every night is clear; "
        f"everything stands in {folder}/report.html"
    )
    say(CAUTION)
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
            "store": store_in(None),
            "progress": ProgressLine(quiet=options.quiet),
        }
        tables, scores = pipeline.score_all(campaign, prospects, **work)
        advice = pipeline.recommend_all(campaign, forecasts, prospects, tables, scores, **work)
        scenarios.append(Scenario(path.stem, tables, advice))
    results = compare_scenarios(scenarios)
    if options.json:
        from dataclasses import asdict

        say_json({"scenarios": [asdict(r) for r in results]})
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
    say(
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
