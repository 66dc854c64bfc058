"""Which layouts of a target still need trials.

The information forecast screens them first. It knows variability and response, which a recovery has
to find out, so that trials succeed less often than it says. A layout whose forecast lies below the
goal takes no part in the search for the cheapest that reaches it; nor, where none does, one whose
forecast lies far below the best in the search for the best.

The others race in rounds. The question is which is the cheapest that reaches the goal, so that a
layout drops out

- when it is shown to lie below the goal,
- when a cheaper one (in clock hours), or one as cheap, is shown to reach it.

If all are shown to miss the goal the question is which comes nearest to it; then a layout drops
out when the leader is shown to beat it, trial by trial on the same draws. The race is settled when
nothing is left to try, and ends for each layout after the most trials allowed.

"Shown" means by evidence that holds however often one looks (`planner.scoring.sequence`).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.scoring.sequence import (
    ALPHA,
    final_bounds,
    log_evidence_above,
    sequence_bounds,
)

__all__ = ["HOPELESS", "Race", "next_round"]

HOPELESS = 0.25
"""A target whose layouts are all shown to stay below this share of the goal is left out of the
schedule (our choice); which of them is the best then matters no more."""

ROUND = 10
"""Trials come in multiples of this."""

GROWTH = 0.5
"""A layout's trials grow by this share from round to round."""

SLACK = 0.1
"""By which a forecast may lie below the goal: it is itself uncertain by a few per cent."""

BEHIND = 0.25
"""By which a forecast may lie below the best of the target. The order by forecast is much the same
as by trials, so that what lies farther behind is not the best (measured; see the tests)."""

CONFIRM = 100
"""Trials of the layout that wins: its success is to be known, not only to be high enough."""

PROMISE_WEIGHT = 5.0
"""Trials that the forecast counts for when guessing where the race will end."""

Counts = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Race:
    """What does not change from round to round; arrays (layouts,)."""

    hours: NDArray[np.float64]
    """Expected clock hours."""
    promise: NDArray[np.float64]
    """Expected success before any trial: it guides the order and proves nothing."""
    can: NDArray[np.bool_]
    """Whether the layout can be scheduled."""
    goal: float
    first: int
    """Trials of a layout's first round."""
    most: int
    """Trials of each layout at most."""


def next_round(race: Race, trials: Counts, success: NDArray[np.bool_]) -> Counts:
    """Return the trials that each layout is to have after the next round.

    Parameters
    ----------
    race : Race
    trials : (layouts,) int array
        Trials so far: of each layout the first ones.
    success : (layouts, >= trials) bool array
        Outcomes; False beyond a layout's trials.

    Returns
    -------
    (layouts,) int array
        Equal to `trials` where nothing more is needed; everywhere when the race is settled.
    """
    hits = success.sum(axis=1)
    lo, hi = final_bounds(hits, trials, race.most)
    reaches = race.can & (lo >= race.goal)
    undecided = race.can & ~reaches & (hi >= race.goal) & (race.promise >= race.goal - SLACK)
    running = undecided & (trials < race.most)
    if reaches.any():
        wanted = running & (race.hours < race.hours[reaches].min())
    elif running.any():
        guess = (hits + PROMISE_WEIGHT * race.promise) / (trials + PROMISE_WEIGHT)
        likely = running & (guess >= race.goal)
        aim = race.hours[likely].min() if likely.any() else np.inf
        wanted = running & (race.hours <= aim)
    else:
        wanted = _may_be_best(race, trials, success) & (trials < race.most)
    grown = np.maximum(trials + ROUND, np.ceil(trials * (1 + GROWTH) / ROUND) * ROUND)
    after = np.maximum(grown, race.first)
    if not wanted.any() and not _hopeless(race, hits, trials):
        hours = np.where(reaches, race.hours, np.inf)
        near = _near_the_best(race)
        winner = int(np.argmin(hours) if reaches.any() else np.argmax(np.where(near, lo, -1.0)))
        wanted[winner] = trials[winner] < min(CONFIRM, race.most)
        after[winner] = CONFIRM
    return np.where(wanted, np.minimum(after, race.most), trials).astype(np.int64)


def _hopeless(race: Race, hits: Counts, trials: Counts) -> bool:
    """Say whether the target is shown to be out of reach, or no layout can be scheduled."""
    _, hi = sequence_bounds(hits, trials, ALPHA / 2)
    return not race.can.any() or bool(hi[_near_the_best(race)].max() < HOPELESS * race.goal)


def _near_the_best(race: Race) -> NDArray[np.bool_]:
    """Say which layouts may be the best of the target, by their forecasts."""
    best = np.max(race.promise, where=race.can, initial=0.0)
    return np.asarray(race.can & (race.promise >= best - BEHIND))


def _may_be_best(race: Race, trials: Counts, success: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Say which layouts may still be the best; none when the leader stands alone."""
    hits = success.sum(axis=1)
    if _hopeless(race, hits, trials):
        return np.zeros_like(race.can)
    near = _near_the_best(race)
    lo, hi = sequence_bounds(hits, trials, ALPHA / 2)
    leader = int(np.argmax(np.where(near, lo, -1.0)))
    shared = np.arange(success.shape[1]) < np.minimum(trials, trials[leader])[:, None]
    better = (success[leader] & ~success & shared).sum(axis=1)
    worse = (~success[leader] & success & shared).sum(axis=1)
    beaten = log_evidence_above(better, better + worse, 0.5) >= -np.log(ALPHA / 2)
    beaten |= hi < lo[leader]
    left = near & ~beaten
    return left if left.sum() > 1 else np.zeros_like(left)
