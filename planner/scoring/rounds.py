"""All layouts of all targets raced in rounds until every recommendation is settled."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.trial import Offer, TrialTable
from planner.scoring.candidates import between
from planner.scoring.draws import Setting
from planner.scoring.fixed import chunks, table_of
from planner.scoring.forecasting import LayoutForecast
from planner.scoring.limits import limits_of
from planner.scoring.placing import place_in
from planner.scoring.race import Race, next_round
from planner.scoring.run import Arrays, Progress, Row, Tools, outcomes
from planner.scoring.screening import forecast_offers
from planner.scoring.sequence import final_bounds
from planner.scoring.trials import run_trials

__all__ = ["Raced", "race_targets"]

STAGE = "trials"

FIRST = 10
"""Trials of a layout's first round."""

GENERATIONS = 3
"""Times that layouts between those raced are looked for."""

NEWCOMERS = 2
"""Layouts that join a race at a time."""

MARGIN = 0.05
"""By which a newcomer is expected to pass the goal: one that only just does takes too many trials
to show it."""


@dataclass(frozen=True, slots=True)
class Raced:
    """The settled race of one target."""

    offer: Offer
    """With the layouts that were added on the way, after the candidates."""
    candidates: int
    table: TrialTable
    forecasts: tuple[LayoutForecast, ...]
    """In the order of the layouts."""
    limits: tuple[float, ...]
    """Correlation that claims of each layout had to exceed; minus infinity where it had no
    trials."""

    def limit(self, layout: Layout) -> float:
        """Return the limit of one layout."""
        return self.limits[self.offer.layouts.index(layout)]


@dataclass(slots=True)
class _Racer:
    """The race of one target while it runs."""

    setting: Setting
    offer: Offer
    forecasts: list[LayoutForecast]
    parts: list[list[Arrays]] = field(default_factory=list)
    limits: dict[int, float] = field(default_factory=dict)

    def table(self) -> TrialTable:
        most = self.setting.simulation.trials
        self.parts += [[] for _ in self.offer.layouts[len(self.parts) :]]
        return table_of(self.offer.target, self.offer.layouts, self.parts, most)

    def wanted(self) -> NDArray[np.int64]:
        """Return the trials that each layout is to have after the next round."""
        table = self.table()
        can = [
            place_in(self.offer.prospect(layout), layout).first.size > 0
            for layout in self.offer.layouts
        ]
        race = Race(
            hours=np.array([f.hours for f in self.forecasts]),
            promise=np.array([f.success for f in self.forecasts]),
            can=np.array(can, dtype=np.bool_),
            goal=self.setting.success.goal,
            first=min(FIRST, self.setting.simulation.trials),
            most=self.setting.simulation.trials,
        )
        return next_round(race, table.trials, table.success)

    def all_limits(self) -> tuple[float, ...]:
        return tuple(self.limits.get(i, -np.inf) for i in range(len(self.offer.layouts)))

    def cheapest_that_reaches(self) -> int | None:
        """Return the layout that the race leaves as the cheapest shown to reach the goal."""
        table, goal = self.table(), self.setting.success.goal
        lo, _ = final_bounds(table.success.sum(axis=1), table.trials, table.most)
        reached = [i for i in range(len(lo)) if lo[i] >= goal and table.trials[i]]
        return min(reached, key=lambda i: self.forecasts[i].hours, default=None)

    def worth_trying(self, best: int, forecasts: Sequence[LayoutForecast]) -> list[LayoutForecast]:
        """Return the cheapest of new layouts that are expected to pass the goal with a margin.

        Expected is the success of the best one's trials and what the forecasts say of the
        difference.
        """
        table = self.table()
        success = table.success[best].sum() / table.trials[best]
        wanted = self.setting.success.goal + MARGIN
        likely = [
            f
            for f in forecasts
            if f.hours < self.forecasts[best].hours
            and success + f.success - self.forecasts[best].success >= wanted
        ]
        return sorted(likely, key=lambda f: f.hours)[:NEWCOMERS]

    def best_so_far(self) -> str:
        """Say how well the best layout does, in a few words."""
        table = self.table()
        share = table.success.sum(axis=1) / np.maximum(table.trials, 1)
        return f"{self.offer.target} {share.max(initial=0.0):.0%} at best"

    def rows(self, layout: int, last: int) -> list[Row]:
        """Return the rows that bring a layout to `last` trials."""
        mine = self.parts[layout]
        first = sum(part["claim"].size for part in mine)
        chosen = self.offer.layouts[layout]
        return [
            Row(self.setting, self.offer.prospect(chosen), chosen, a, b, self.limits[layout])
            for a, b in chunks(first, last)
        ]


@dataclass(slots=True)
class _OneStage:
    """Shows the many small pieces of work of a race as one stage."""

    progress: Progress
    before: int = 0
    note: str = ""

    def __call__(self, _what: str, done: int, total: int, _note: str = "", /) -> None:
        # One more than is known of: the race goes on until `end`.
        self.progress(STAGE, self.before + done, self.before + total + 1, self.note)
        if done == total:
            self.before += total

    def end(self) -> None:
        self.progress(STAGE, self.before, self.before, self.note)


def race_targets(setting: Setting, offers: Sequence[Offer], tools: Tools) -> list[Raced]:
    """Run trials where they settle which layout to recommend; see `planner.scoring.race`.

    When a race is settled with a layout that reaches the goal, cheaper layouts between the
    candidates are forecast, and the most promising join the race; so a few times over.

    Parameters
    ----------
    setting : Setting
        Its ``simulation.trials`` is the most that any layout is given.
    offers : sequence of Offer
    tools : Tools

    Returns
    -------
    list of Raced
        In the order of `offers`.
    """
    forecasts = forecast_offers(setting, offers, tools)
    candidates = [len(offer.layouts) for offer in offers]
    stage = _OneStage(tools.progress)
    tools = replace(tools, progress=stage)
    racers = [_Racer(setting, offer, mine) for offer, mine in zip(offers, forecasts, strict=True)]
    running = list(racers)
    for _ in range(GENERATIONS + 1):
        winners = running
        while running:
            settled = len(racers) - len(running)
            stage.note = f"{settled} of {len(racers)} targets settled, {running[0].best_so_far()}"
            running = _one_round(running, tools)
        running = _joined(winners, tools)
    stage.end()
    return [
        Raced(r.offer, n, r.table(), tuple(r.forecasts), r.all_limits())
        for r, n in zip(racers, candidates, strict=True)
    ]


def _one_round(racers: Sequence[_Racer], tools: Tools) -> list[_Racer]:
    """Give each target's undecided layouts more trials; return the targets that had some."""
    asked = []
    for racer in racers:
        after = racer.wanted()
        before = racer.table().trials
        asked += [(racer, int(i), int(after[i])) for i in np.flatnonzero(after > before)]
    new = [(racer, i) for racer, i, _ in asked if i not in racer.limits]
    found = limits_of(
        [(r.setting, r.offer.prospect(r.offer.layouts[i]), r.offer.layouts[i]) for r, i in new],
        tools,
    )
    for (racer, i), limit in zip(new, found, strict=True):
        racer.limits[i] = limit
    rows = [(racer, i, row) for racer, i, last in asked for row in racer.rows(i, last)]
    going = {id(racer) for racer, _, _ in asked}
    done = outcomes(run_trials, [row for _, _, row in rows], tools, STAGE)
    for (racer, i, _), arrays in zip(rows, done, strict=True):
        racer.parts[i].append(arrays)
    return [racer for racer in racers if id(racer) in going]


def _joined(racers: Sequence[_Racer], tools: Tools) -> list[_Racer]:
    """Let promising layouts between those raced join; return the targets that got some."""
    found = [(racer, racer.cheapest_that_reaches()) for racer in racers]
    leaders = [(racer, best) for racer, best in found if best is not None]
    offers = []
    for racer, best in leaders:
        near = between(racer.offer.layouts, racer.offer.layouts[best])
        fresh = tuple(layout for layout in near if layout not in racer.offer.layouts)
        offers.append(replace(racer.offer, layouts=fresh))
    setting = racers[0].setting if racers else None
    forecasts = forecast_offers(setting, offers, tools) if setting else []
    again = []
    for (racer, best), mine in zip(leaders, forecasts, strict=True):
        chosen = racer.worth_trying(best, mine)
        if chosen:
            layouts = racer.offer.layouts + tuple(f.layout for f in chosen)
            racer.offer = replace(racer.offer, layouts=layouts)
            racer.forecasts += chosen
            again.append(racer)
    return again
