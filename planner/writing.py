"""A finished plan written into its folder: tables, figures, report, provenance."""

from __future__ import annotations

import re
from collections.abc import Iterable
from pathlib import Path
from typing import NamedTuple

from planner import export, report
from planner.base.files import write_bytes
from planner.base.workers import Workers
from planner.campaign import Reading
from planner.model.plan import Plan
from planner.model.trial import Prospect, Score, TrialTable
from planner.schedule import Request, requests_of
from planner.scoring import Setting, ambiguity_of, example_of, setting_of

__all__ = ["write_plan", "write_schedule"]


def write_plan(plan: Plan, reading: Reading, folder: Path, workers: Workers) -> None:
    """Write everything a plan holds into a folder that is ours. Raises `OutputError`."""
    names = [t.name for t in plan.campaign.targets]
    tables = {
        "lags": export.lags_table(plan.forecasts),
        "windows": export.windows_table(names, plan.skies),
        "seasons": export.seasons_table(plan.campaign, plan.prospects),
        "scores": export.scores_table(plan.scores),
        "recommendation": export.recommendation_table(plan),
        "epochs": export.epochs_table(plan.prospects),
        "time": export.time_table(plan.time_spent),
        "opinions": export.opinions_table(plan.opinions),
        "limits": export.causes_table(plan.recommendations),
        "helps": export.helps_table(plan.recommendations),
        "sensitivity": export.sensitivity_table(plan.sensitivities),
        "lists": export.subsets_table(plan.subsets),
    }
    for name, table in tables.items():
        export.write_ecsv(table, folder / f"{name}.ecsv")
    write_schedule(plan, folder)
    figures = draw_figures(plan, workers)
    (folder / "figures").mkdir(exist_ok=True)
    stems = file_names(figures)
    for title, image in figures.items():
        write_bytes(folder / "figures" / f"{stems[title]}.png", image)
    for old in (folder / "figures").glob("*.png"):
        if old.stem not in stems.values():
            old.unlink()  # of a target that an earlier plan in this folder had
    defaults = [(d.key, d.value, d.reason) for d in reading.defaults]
    write_bytes(
        folder / "report.html",
        report.page(plan, figures, export.as_rows(tables["epochs"]), defaults),
    )
    export.run_json(plan.run, folder / "run.json")


def write_schedule(plan: Plan, folder: Path) -> None:
    """Write what telescopes and teams need of a plan into a folder. Raises `OutputError`."""
    campaign = plan.campaign
    schedule = export.schedule_table(campaign, plan.visits)
    blocks = export.blocks_table(campaign, _requests(plan), plan.visits)
    for name, table in (("schedule", schedule), ("blocks", blocks)):
        export.write_ecsv(table, folder / f"{name}.ecsv")
        export.write_csv(table, folder / f"{name}.csv")
    write_bytes(folder / "schedule.ics", export.calendar(campaign, schedule))
    write_bytes(folder / "schedule.json", export.schedule_json(campaign, schedule))
    write_bytes(folder / "nights.html", export.night_sheets(campaign, plan.skies, plan.visits))


def _requests(plan: Plan) -> tuple[Request, ...]:
    """Return what the schedule was made from."""
    chosen = [
        (prospect, advice.score.layout)
        for prospect, advice in zip(plan.prospects, plan.recommendations, strict=True)
        if advice.scheduled and advice.score is not None
    ]
    return requests_of(plan.campaign, chosen)


class _Card(NamedTuple):
    """What the figures of one target are drawn from."""

    setting: Setting
    prospect: Prospect
    table: TrialTable
    scores: tuple[Score, ...]
    advised: Score
    goal: float


def draw_figures(plan: Plan, workers: Workers) -> dict[str, bytes]:
    """Return every figure of a plan as PNG, by what it shows."""
    setting = setting_of(plan.campaign)
    figures = {
        f"visibility {site}": report.png(report.visibility_figure(plan.campaign, sky))
        for site, sky in plan.skies.items()
    }
    cards = [
        _Card(
            setting,
            prospect,
            table,
            tuple(s for s in plan.scores if s.target == advice.target),
            advice.score,
            plan.campaign.success.goal,
        )
        for prospect, table, advice in zip(
            plan.prospects, plan.trials, plan.recommendations, strict=True
        )
        if advice.score is not None
    ]
    drawn = dict(workers.each(_of_one_target, cards))
    for number in range(len(cards)):
        figures |= drawn[number]
    return figures


def _of_one_target(card: _Card) -> dict[str, bytes]:
    name, layout = card.advised.target, card.advised.layout
    grid = report.success_figure(card.scores, card.advised, card.goal)
    example = example_of(card.setting, card.prospect, layout, card.table)
    curve = ambiguity_of(card.setting, card.prospect, layout)
    lag_d = card.prospect.forecast.lag_obs_d
    return {
        f"success {name}": report.png(grid),
        f"example {name}": report.png(report.example_figure(example)),
        f"ambiguity {name}": report.png(report.ambiguity_figure(curve, lag_d)),
    }


def file_names(titles: Iterable[str]) -> dict[str, str]:
    """Return a file name that any system takes for each title, no two alike."""
    names: dict[str, str] = {}
    for title in titles:
        stem = re.sub(r"[^\w+.-]+", "-", title).strip("-.") or "figure"
        name, number = stem, 1
        while name.casefold() in {taken.casefold() for taken in names.values()}:
            number += 1
            name = f"{stem}-{number}"
        names[title] = name
    return names
