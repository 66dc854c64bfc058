"""Which targets, in which layouts, give the most lags for a number of hours."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import PlanError
from planner.base.hushed import hushed
from planner.model.campaign import Campaign, Layout
from planner.model.plan import Subset
from planner.model.trial import Score
from planner.scoring import Raced, raced_scores

__all__ = ["Option", "best_list", "lists_of", "options_of"]

FEWEST_TRIALS = 20
"""Layouts with fewer trials are no options: their success is hardly known."""

SHARES = (0.2, 0.4, 0.6, 0.8, 1.0)
"""Of the hours that all recommended layouts take: for these the best lists are found."""

GAP = 1e-6
"""Relative gap at which a list counts as the best."""


@dataclass(frozen=True, slots=True)
class Option:
    """One target observed in one layout."""

    target: str
    layout: Layout
    hours: float
    success: float
    """Chance of a right lag."""
    worth: float
    """Of a lag of this target: its priority."""
    outcomes: NDArray[np.bool_]
    """Trial by trial; the weather of a trial is the same for all targets."""


def options_of(campaign: Campaign, raced: Sequence[Raced]) -> list[Option]:
    """Return every layout of every target that has had trials enough.

    Success is drawn towards one half by two trials (Laplace), so that a few lucky ones do not win.
    """
    options = []
    for target, race in zip(campaign.targets, raced, strict=True):
        for i, score in enumerate(raced_scores(race)):
            if score.trials >= FEWEST_TRIALS and score.success > 0:
                hits = score.success * score.trials
                options.append(
                    Option(
                        target.name,
                        score.layout,
                        score.hours,
                        (hits + 1) / (score.trials + 2),
                        target.priority,
                        race.table.success[i, : score.trials],
                    )
                )
    return options


def best_list(options: Sequence[Option], hours: float) -> list[int]:
    """Return the options, at most one a target, with the most expected lags within the hours.

    A multiple-choice knapsack, solved by integer programming (HiGHS through scipy). Lags count by
    the target's priority; of lists that are worth the same the one of fewer hours is taken.

    Parameters
    ----------
    options : sequence of Option
    hours : float
        Clock hours that may be spent; not negative.

    Raises
    ------
    PlanError
        If the solver gives up.
    """
    from scipy.optimize import Bounds, LinearConstraint, milp
    from scipy.sparse import csr_array

    if not options:
        return []
    cost = np.array([o.hours for o in options])
    worth = np.array([o.worth * o.success for o in options])
    targets = {name: i for i, name in enumerate(dict.fromkeys(o.target for o in options))}
    which = np.array([targets[o.target] for o in options])
    everything = np.arange(len(options))
    once = csr_array((np.ones(len(options)), (which, everything)), (len(targets), len(options)))
    # A thousandth of a lag for all hours together: enough to prefer the cheaper of equals.
    thrift = 1e-3 * worth.max() / max(cost.sum(), 1e-9)
    with hushed():  # the solver prints remarks that no option switches off
        found = milp(
            thrift * cost - worth,
            integrality=np.ones(len(options)),
            bounds=Bounds(0, 1),
            constraints=[LinearConstraint(once, ub=1), LinearConstraint(cost[None, :], ub=hours)],
            options={"mip_rel_gap": GAP},
        )
    if found.status != 0:
        raise PlanError(f"the best list of targets was not found: {found.message}")
    return [int(i) for i in np.flatnonzero(found.x > 0.5)]


def lists_of(
    campaign: Campaign, raced: Sequence[Raced], best: Sequence[Score | None], hours: float | None
) -> tuple[Subset, ...]:
    """Return the best lists for shares of the hours that all recommended layouts take.

    Parameters
    ----------
    campaign : Campaign
    raced : sequence of Raced
        By target.
    best : sequence of Score or None
        The recommended layouts.
    hours : float or None
        For so many hours instead.
    """
    options = options_of(campaign, raced)
    all_of_them = sum(s.hours for s in best if s is not None)
    budgets = [share * all_of_them for share in SHARES] if hours is None else [hours]
    return tuple(_subset(options, best_list(options, budget), budget) for budget in budgets)


def _subset(options: Sequence[Option], chosen: Sequence[int], hours: float) -> Subset:
    """Count the lags of a list, trial by trial: targets fail together in a bad year."""
    mine = [options[i] for i in chosen]
    shared = min((o.outcomes.size for o in mine), default=1)
    counts = np.zeros(shared)
    for o in mine:
        counts += o.outcomes[:shared]
    lo, hi = np.percentile(counts, [10, 90])
    return Subset(
        hours=hours,
        chosen=tuple((o.target, o.layout) for o in mine),
        lags=float(sum(o.success for o in mine)),
        lags_lo=float(lo),
        lags_hi=float(hi),
        spent=float(sum(o.hours for o in mine)),
    )
