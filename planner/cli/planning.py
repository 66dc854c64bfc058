"""Commands that run trials: score, schedule, plan, compare."""

from __future__ import annotations

from argparse import Namespace
from pathlib import Path
from typing import TYPE_CHECKING

from planner.base.errors import InputError
from planner.cli.shared import (
    CAUTION,
    LAYOUT_HEADER,
    claim,
    give,
    layout_cells,
    read,
    say,
    say_json,
    working,
)
from planner.cli.terminal import table_text

if TYPE_CHECKING:
    from collections.abc import Sequence

    from planner.model.campaign import Campaign
    from planner.model.plan import Subset
    from planner.model.trial import Offer
    from planner.scoring import Tools

__all__ = ["compare", "plan", "schedule", "score"]


def score(options: Namespace) -> int:
    """Print every layout's chance of success for every target."""
    from planner import export, pipeline
    from planner.recommend import lists_of
    from planner.scoring import observe_sky, raced_scores

    reading = read(options)
    campaign = reading.campaign
    folder = claim(options, reading)
    skies = observe_sky(campaign)
    offers = pipeline.offers_of(campaign, pipeline.forecast_targets(campaign), skies)
    hours = options.hours
    if options.nights is not None:
        site = campaign.site(campaign.line.feeds[0].telescope).name
        hours = options.nights * pipeline.dark_hours(skies)[site]
    with working(options, folder) as tools:
        if options.forecast:
            return _forecast(options, campaign, offers, tools, folder)
        raced = pipeline.race_all(campaign, offers, tools)
    flat = [s for r in raced for s in raced_scores(r)]
    tables = {"scores": export.scores_table(flat)}
    lists: tuple[Subset, ...] = ()
    if hours is not None:
        lists = lists_of(campaign, raced, [], hours)
        tables["lists"] = export.subsets_table(lists)
    if give(options, folder, tables):
        return 0
    rows = [
        [
            s.target,
            *layout_cells(s.layout),
            f"{s.epochs_line:.0f}",
            f"{s.hours:.0f}",
            f"{s.promise:.0%}",
            *(
                [
                    f"{s.success:.0%}",
                    f"{s.success_lo:.0%}–{s.success_hi:.0%}",
                    f"{s.false_claims:.0%}",
                    str(s.trials),
                ]
                if s.trials
                else ["–"] * 4
            ),
            s.note,
        ]
        for s in flat
    ]
    header = [
        "target",
        *LAYOUT_HEADER,
        "spectra",
        "hours",
        "forecast",
        "success",
        "90 % bounds",
        "wrong",
        "trials",
        "note",
    ]
    say(table_text(header, rows))
    for best in lists:
        names = ", ".join(name for name, _ in best.chosen) or "none"
        say(
            f"\nBest list for {best.hours:.0f} clock hours: {names}; {best.lags:.1f} right lags "
            f"({best.lags_lo:.0f} to {best.lags_hi:.0f}), {best.spent:.0f} h spent"
        )
    return 0


def _forecast(
    options: Namespace,
    campaign: Campaign,
    offers: Sequence[Offer],
    tools: Tools,
    folder: Path | None,
) -> int:
    """Print the layouts of each target ranked by their information forecast."""
    from planner import export
    from planner.scoring import forecast_offers, setting_of

    by_target = forecast_offers(setting_of(campaign), offers, tools)
    ranked = [f for mine in by_target for f in sorted(mine, key=lambda f: (-f.success, f.hours))]
    if give(options, folder, {"forecast": export.forecast_table(ranked)}):
        return 0
    rows = [
        [
            f.target,
            *layout_cells(f.layout),
            f"{f.success:.0%}",
            f"{f.error:.0%}" if f.error < 10 else "–",
            f"{f.hours:.0f}",
        ]
        for f in ranked
    ]
    say(table_text(["target", *LAYOUT_HEADER, "expected success", "least error", "hours"], rows))
    say(
        "\nExpected success of a likelihood recovery that knows variability and response; trials "
        "fall short of it."
    )
    return 0


def schedule(options: Namespace) -> int:
    """Print the night-by-night schedule of all targets."""
    from planner import export, pipeline
    from planner.writing import write_schedule

    reading = read(options)
    folder = claim(options, reading)
    with working(options, folder) as tools:
        made = pipeline.make_plan(reading, tools)
    if folder is not None:
        write_schedule(made, folder)
    table = export.schedule_table(made.campaign, made.visits)
    if give(options, None, {"schedule": table}):
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
    with working(options, folder) as tools:
        made = pipeline.make_plan(reading, tools)
        write_plan(made, reading, folder, tools.workers)
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
                *layout_cells(s.layout),
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
                *LAYOUT_HEADER,
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
        if r.causes:
            wants = "; ".join(f"{c.want} ({c.share:.0%})" for c in r.causes[:3])
            say(f"  its failed trials lack {wants}.")
        for rank, h in enumerate(r.helps[:3], start=1):
            say(
                f"  {rank}. {h.change}: {h.gain:+.0%} ({h.gain_lo:+.0%} to {h.gain_hi:+.0%}) for "
                f"{h.hours:+.0f} h"
            )
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
    from planner.recommend import advise_without_help
    from planner.scoring import observe_sky

    if len(options.files) < 2:
        raise InputError("compare: found one file; expected two or more campaign files")
    readings = [pipeline.read(path, options.seed) for path in options.files]
    scenarios = []
    with working(options, None) as tools:
        for path, reading in zip(options.files, readings, strict=True):
            campaign = reading.campaign
            forecasts = pipeline.forecast_targets(campaign)
            offers = pipeline.offers_of(campaign, forecasts, observe_sky(campaign))
            raced = pipeline.race_all(campaign, offers, tools)
            advice = tuple(advise_without_help(campaign, raced))
            scenarios.append(Scenario(path.stem, tuple(r.table for r in raced), advice))
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
