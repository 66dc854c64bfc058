"""Cost and yield of scenarios, and how they differ."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.model.plan import Recommendation
from planner.model.trial import TrialTable

__all__ = ["Scenario", "ScenarioResult", "compare_scenarios"]

Z_90 = 1.6448536269514722
"""Normal quantile of a two-sided 90 % interval."""


@dataclass(frozen=True, slots=True)
class Scenario:
    """One campaign file, worked out as far as its recommendations."""

    name: str
    tables: tuple[TrialTable, ...]
    recommendations: tuple[Recommendation, ...]


@dataclass(frozen=True, slots=True)
class ScenarioResult:
    """What one scenario costs and yields, each target at its recommended layout."""

    name: str
    targets: int
    goal_met: int
    hours: float
    """Clock hours of the targets that are worth scheduling."""
    lags: float
    """Expected number of right lags."""
    lags_lo: float
    """10th percentile over trials."""
    lags_hi: float
    """90th percentile over trials."""
    wrong_claims: float
    gain: float
    """Expected lags more than in the first scenario, trial by trial."""
    gain_lo: float
    gain_hi: float
    """90 % interval of `gain`."""
    told_apart: bool
    """Whether that interval excludes zero."""


def compare_scenarios(scenarios: Sequence[Scenario]) -> tuple[ScenarioResult, ...]:
    """Return each scenario's cost and yield, paired with the first.

    Targets are taken at their recommended layouts, each with the telescopes to itself, over the
    trials that all of them, and the paired scenarios, have had.
    """
    right = [_per_trial(s, "success") for s in scenarios]
    wrong = [_per_trial(s, "wrong") for s in scenarios]
    results = []
    for scenario, lags, false in zip(scenarios, right, wrong, strict=True):
        shared = min(lags.size, right[0].size)
        gain = lags[:shared] - right[0][:shared]
        half = Z_90 * float(np.std(gain, ddof=1) / np.sqrt(shared)) if shared > 1 else np.inf
        mean = float(np.mean(gain))
        kept = [r for r in scenario.recommendations if r.scheduled]
        results.append(
            ScenarioResult(
                name=scenario.name,
                targets=len(scenario.recommendations),
                goal_met=sum(r.decision == "observe" for r in scenario.recommendations),
                hours=sum(r.score.hours for r in kept if r.score is not None),
                lags=float(np.mean(lags)),
                lags_lo=float(np.percentile(lags, 10)),
                lags_hi=float(np.percentile(lags, 90)),
                wrong_claims=float(np.mean(false)),
                gain=mean,
                gain_lo=mean - half,
                gain_hi=mean + half,
                told_apart=abs(mean) > half,
            )
        )
    return tuple(results)


def _per_trial(scenario: Scenario, what: str) -> NDArray[np.float64]:
    """Return the number of right (or wrong) claims in each trial, over scheduled targets."""
    mine = [
        (table, table.layouts.index(advice.score.layout))
        for table, advice in zip(scenario.tables, scenario.recommendations, strict=True)
        if advice.scheduled and advice.score is not None
    ]
    shared = min((int(table.trials[at]) for table, at in mine), default=1)
    total = np.zeros(shared)
    for table, at in mine:
        success = table.success[at, :shared]
        total += success if what == "success" else table.claim[at, :shared] & ~success
    return total
