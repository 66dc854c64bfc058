"""Which targets, in which layouts, for a given number of hours; and how many lags to expect."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq, linprog
from scipy.sparse import csr_array, vstack
from scipy.special import ndtr, ndtri
from scipy.stats.qmc import Halton

from planner.base.errors import PlanError
from planner.model.campaign import Layout

__all__ = ["LagsDistribution", "Option", "Yield", "best_subset", "lags_distribution", "yield_curve"]

MOST_STATES = 50_000
"""Sets of options looked at side by side; beyond it the least promising are let go."""
MORE_PRICES = 48
"""Other prices of the resources, around the best, that each set of options is judged at too."""
UNIT_H = 1e-6
"""Hours are counted in these (4 ms), so that what just fits the hours granted does fit."""
NODES = 400
"""Kinds of weather, each as likely as another, over which the number of lags is averaged."""


@dataclass(frozen=True, slots=True)
class Option:
    """One target observed in one layout."""

    target: str
    layout: Layout
    success: float
    costs: tuple[float, ...]
    """Expected clock hours on each resource (telescope)."""
    weight: float = 1.0
    """What a lag of this target is worth; 1: a lag counted once."""


@dataclass(frozen=True, slots=True)
class Yield:
    """What the best subset of targets gives for its budgets."""

    budgets: tuple[float, ...]
    chosen: tuple[int, ...]
    """Indices of the chosen options, ascending."""
    lags: float
    """Expected number of lags: sum of weight times success."""
    costs: tuple[float, ...]
    """Hours used of each resource."""
    short: float
    """Lags by which some other subset might be better at most; 0: there is none better."""


@dataclass(frozen=True, slots=True)
class LagsDistribution:
    """How many of the chosen targets will give their lag."""

    mean: float
    lo10: int
    """Percentiles: smallest number not exceeded in at least 10, 50 and 90 % of campaigns."""
    median: int
    hi90: int
    probabilities: tuple[float, ...]
    """Of 0, 1, 2... lags."""


def best_subset(options: Sequence[Option], budgets: Sequence[float]) -> tuple[int, ...]:
    """Return the indices of the options that together give the most lags within the budgets.

    At most one option per target, and none that is worth nothing. Of subsets with equal sums the
    one with the fewest hours over all resources is taken, then the one with the earlier targets and
    their earlier options. Lags and hours are counted to a billionth of all there are to be had.

    Parameters
    ----------
    options : sequence of Option
        All with as many costs as there are budgets. Options of a target need not be neighbours.
    budgets : sequence of float
        Hours of each resource, not negative; inf: no limit.

    Raises
    ------
    ValueError
        If a success lies outside 0 to 1, a cost or weight is negative or not finite, a budget is
        negative or NaN, or their numbers differ.
    PlanError
        If the linear programme, from which the search starts, is not solved.

    Notes
    -----
    A multiple-choice knapsack with several limits. At given prices of the resources each option is
    worth its lags less the price of its hours, and no subset gives more than each target's best
    worth and the price of all hours granted together; this bound is lowest at the prices of the
    linear relaxation. All subsets that can come within some lags of the bound are built up target
    by target: those go on that none dominates and that still can, at those prices and at others
    around them. The lags conceded are raised until the best subset found falls no further short:
    none left out can be better. (Pruned dynamic programming over an expanding core: Pisinger 1995,
    Eur. J. Oper. Res. 83, 394; Nemhauser and Ullmann 1969, Manag. Sci. 15, 494; from memory.) With
    one or two resources this is exact in practice; should more than `MOST_STATES` subsets compete,
    the most promising go on, and `Yield.short` bounds what is lost. A general integer programme
    takes longer, and HiGHS prints lines to stdout that cannot be switched off.
    """
    return _solve(options, budgets).chosen


def yield_curve(
    options: Sequence[Option], budgets_list: Sequence[Sequence[float]]
) -> tuple[Yield, ...]:
    """Return the best subset, and what it gives, for each of several budgets; see `best_subset`."""
    return tuple(_solve(options, budgets) for budgets in budgets_list)


@dataclass(frozen=True, slots=True)
class _Core:
    """The options worth a look, in whole units, target by target, and the prices."""

    index: NDArray[np.int64]
    first: NDArray[np.int64]
    """Where each target's options begin, (targets,)."""
    rank: NDArray[np.int64]
    """What is maximised: value, and as last digits hours not spent."""
    cost: NDArray[np.int64]
    """(options, limited resources), in `UNIT_H`."""
    loss: NDArray[np.float64]
    value: NDArray[np.float64]
    best: NDArray[np.float64]
    """Loss of leaving a target out, (targets,)."""
    budget: NDArray[np.int64]
    price: NDArray[np.float64]
    """Lags per unit of each limited resource."""
    bound: float
    """What no subset exceeds."""


def _solve(options: Sequence[Option], budgets: Sequence[float]) -> Yield:
    value, cost, limit = _checked(options, budgets)
    core = _core(options, value, cost, limit)
    chosen, short = _search(core) if core else (np.zeros(0, dtype=np.int64), 0.0)
    lags, costs = float(value[chosen].sum()), cost[chosen].sum(axis=0)
    return Yield(tuple(limit.tolist()), tuple(chosen.tolist()), lags, tuple(costs.tolist()), short)


def _checked(
    options: Sequence[Option], budgets: Sequence[float]
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return values (options,), costs (options, resources) and budgets."""
    limit = np.asarray(budgets, dtype=float)
    if limit.ndim != 1 or not np.all(limit >= 0):
        raise ValueError(f"budgets {budgets} must be a list of hours, none negative or NaN")
    for o in options:
        if not 0 <= o.success <= 1:
            raise ValueError(f"{o.target}: success {o.success} is not between 0 and 1")
        if len(o.costs) != len(limit):
            raise ValueError(f"{o.target}: {len(o.costs)} costs for {len(limit)} budgets")
        if not all(np.isfinite(x) and x >= 0 for x in (*o.costs, o.weight)):
            raise ValueError(
                f"{o.target}: costs {o.costs} or weight {o.weight} negative or infinite"
            )
    value = np.array([o.weight * o.success for o in options], dtype=float)
    cost = np.array([o.costs for o in options], dtype=float)
    return value, cost.reshape(len(options), len(limit)), limit


def _core(
    options: Sequence[Option],
    value: NDArray[np.float64],
    cost: NDArray[np.float64],
    limit: NDArray[np.float64],
) -> _Core | None:
    """Return the options that no other of their target dominates, with their losses; None: none."""
    names = {name: i for i, name in enumerate(dict.fromkeys(o.target for o in options))}
    of = np.array([names[o.target] for o in options], dtype=np.int64)
    fits = (value > 0) & np.all(np.rint(cost / UNIT_H) <= np.rint(limit / UNIT_H), axis=1)
    order = np.flatnonzero(fits)
    order = order[np.argsort(of[order], kind="stable")]
    if not order.size:
        return None
    groups = np.split(order, np.flatnonzero(np.diff(of[order])) + 1)
    keep = [i[_undominated(value[i], cost[i])] for i in groups]
    index = np.concatenate(keep)
    target = np.repeat(np.arange(len(keep)), [i.size for i in keep])

    # Decimal units, so that the usual fractions of trials and of hours stay whole; a thousand
    # millions of them at most, so that lags and hours fit into one number.
    hours = cost.sum(axis=1)
    sums = [sum(x[i].max() for i in keep) for x in (value, hours)]
    unit, unit_h = (10.0 ** np.ceil(np.log10(x or 1.0) - 9) for x in sums)
    whole = np.rint(value[index] / unit).astype(np.int64)
    rank = whole * 2_000_000_000 - np.rint(hours[index] / unit_h).astype(np.int64)
    limited = limit < np.sum([cost[i].max(axis=0) for i in keep], axis=0)
    units = np.rint(cost[index][:, limited] / UNIT_H).astype(np.int64)
    budget = np.rint(limit[limited] / UNIT_H).astype(np.int64)
    lags = whole * unit
    price = _prices(lags, units, target, budget)
    worth = lags - units @ price
    first = np.flatnonzero(np.diff(target, prepend=-1))
    best = np.maximum(np.maximum.reduceat(worth, first), 0.0)
    bound = float(best.sum() + budget @ price)
    return _Core(index, first, rank, units, best[target] - worth, lags, best, budget, price, bound)


def _undominated(value: NDArray[np.float64], cost: NDArray[np.float64]) -> NDArray[np.bool_]:
    """Say which options are not matched by a better or cheaper one, or by an equal earlier one."""
    matched = (value[:, None] >= value) & np.all(cost[:, None] <= cost, axis=2)
    first = np.tri(value.size, k=-1, dtype=bool).T
    return np.asarray(~np.any(matched & (~matched.T | first), axis=0))


def _prices(
    value: NDArray[np.float64],
    cost: NDArray[np.int64],
    target: NDArray[np.int64],
    budget: NDArray[np.int64],
) -> NDArray[np.float64]:
    """Return what a unit of each limited resource is worth in the linear relaxation."""
    n = value.size
    if not budget.size:
        return np.zeros(0)
    scale, worth = np.maximum(cost.max(axis=0), 1).astype(float), value.max()
    once = csr_array((np.ones(n), (target, np.arange(n))), shape=(target[-1] + 1, n))
    solved = linprog(
        -value / worth,
        A_ub=vstack([once, csr_array((cost / scale).T)]),
        b_ub=np.concatenate([np.ones(once.shape[0]), budget / scale]),
        bounds=(0, None),
        method="highs",
    )
    if solved.status != 0:
        raise PlanError(f"the best subset of targets was not found: {solved.message}")
    price = np.maximum(-solved.ineqlin.marginals[once.shape[0] :], 0.0)
    return np.asarray(price * worth / scale, dtype=float)


def _search(core: _Core) -> tuple[NDArray[np.int64], float]:
    """Return the options of the best subset and by how much another might be better."""
    rounding = 1e-9 * core.bound
    within = 1e-3 * float(core.value.max())
    best: NDArray[np.int64] | None = None
    while True:
        found, complete = _within(core, within + rounding)
        if found is not None and (best is None or core.rank[found].sum() > core.rank[best].sum()):
            best = found
        within *= 1.4
        if best is not None:
            shortfall = core.bound - float(core.value[best].sum())
            if not complete or shortfall <= within / 1.4 + rounding:
                return np.sort(core.index[best]), 0.0 if complete else max(shortfall, 0.0)
            within = min(within, shortfall)


def _within(core: _Core, within: float) -> tuple[NDArray[np.int64] | None, bool]:
    """Return the best subset that falls short by at most `within`; and whether all were seen."""
    # A last row of zeros stands for a target left out.
    value, rank = np.append(core.value, 0.0), np.append(core.rank, 0)
    cost = np.vstack([core.cost, np.zeros((1, core.budget.size), dtype=np.int64)])
    rows = np.split(np.arange(core.value.size), core.first[1:])
    choices = [
        np.append(row[core.loss[row] <= within], [-1] if out <= within else []).astype(np.int64)
        for row, out in zip(rows, core.best, strict=True)
    ]
    least = _after([cost[c].min(axis=0) for c in choices])
    prices = _around(core.price)
    ahead = _after([(value[c, None] - cost[c] @ prices.T).max(axis=0) for c in choices])
    floor = core.bound - within

    ranks, used, sums = np.zeros(1, dtype=np.int64), cost[-1:], np.zeros(1)
    steps: list[tuple[NDArray[np.int64], NDArray[np.int64]]] = []
    complete = True
    for t, choice in enumerate(choices):
        ranks = (ranks[:, None] + rank[choice]).ravel()
        used = (used[:, None] + cost[choice]).reshape(ranks.size, core.budget.size)
        sums = (sums[:, None] + value[choice]).ravel()
        kept = np.flatnonzero(np.all(used + least[t] <= core.budget, axis=1))
        if choice.size > 1:
            for price, rest in zip(prices, ahead[t], strict=True):
                reach = sums[kept] + rest + (core.budget - used[kept]) @ price
                kept = kept[reach >= floor]
            kept = kept[_competing(ranks[kept], used[kept])]
        if kept.size > MOST_STATES:
            complete = False
            reach = sums[kept] + ahead[t, 0] + (core.budget - used[kept]) @ core.price
            kept = np.sort(kept[np.argsort(-reach, kind="stable")[:MOST_STATES]])
        steps.append((kept // choice.size, choice[kept % choice.size]))
        ranks, used, sums = ranks[kept], used[kept], sums[kept]
    if not sums.size:
        return None, complete
    at, picked = int(np.argmax(ranks)), []
    for parent, choice in reversed(steps):
        picked.append(choice[at])
        at = int(parent[at])
    found = np.array(picked[::-1], dtype=np.int64)
    return found[found >= 0], complete


def _around(price: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the prices, and others around them, (prices, resources)."""
    if not price.size:
        return price[None]
    # Near ones tell more while many targets are left to choose, far ones towards the end.
    spread = np.where(np.arange(MORE_PRICES) % 2, 0.08, 0.35)
    even = Halton(price.size, scramble=False).random(MORE_PRICES + 1)[1:]
    return np.vstack([price, price * np.exp(spread[:, None] * ndtri(even))])


def _after(each: list[NDArray[np.float64]]) -> NDArray[np.float64]:
    """Return the sums over all later rows."""
    rows = np.array(each, dtype=float)
    return np.asarray(rows[::-1].cumsum(axis=0)[::-1] - rows)


def _competing(sums: NDArray[np.int64], used: NDArray[np.int64]) -> NDArray[np.int64]:
    """Return, in order, the states that no other of equal use but of the last resource dominates.

    Of equal states the first is kept: states stand in the order of preference for early targets.
    """
    if sums.size < 2:
        return np.arange(sums.size)
    order = np.lexsort((-sums, *used.T[::-1]))
    group = np.zeros(sums.size, dtype=np.int64)
    group[1:] = np.cumsum(np.any(np.diff(used[order, :-1], axis=0) != 0, axis=1))
    # The place of a sum among all sums, so that one running maximum serves all groups.
    place = np.unique(sums, return_inverse=True)[1].ravel()[order] + group * sums.size
    top = np.maximum.accumulate(place)
    return np.sort(order[np.append(True, place[1:] > top[:-1])])


def lags_distribution(successes: Sequence[NDArray[np.bool_]]) -> LagsDistribution:
    """Return how many targets give their lag, if they share the weather.

    Trial t has the same weather for all targets: in a bad year many fail at once. Counting lags
    trial by trial would use only the trials that all targets have had; instead every outcome is
    used. Each target succeeds as often as in all of its trials, and given the year's weather w,
    standard normal, with chance ``Phi((Phi^-1(p) + sqrt(r) w) / sqrt(1 - r))`` (one common factor:
    Vasicek 1987, from memory). The single r gives the covariances seen in the trials that each
    pair of targets shares, weighted by their number. The number of lags is a sum of independent
    trials in each weather, averaged over w; it is that of independent targets where r is 0.

    Targets of different seasons or sites have less weather in common, which lowers r for all; the
    spread of the sum stays right. How far the successes are uncertain is not in the spread.

    Parameters
    ----------
    successes : sequence of ndarray of bool
        For each target, its outcomes by trial number, at least one.

    Raises
    ------
    ValueError
        If a target had no trial.
    """
    if not all(s.size for s in successes):
        raise ValueError("a target without trials has no success to count with")
    n = len(successes)
    hit, tried = np.zeros((2, n, max((s.size for s in successes), default=0)))
    for i, s in enumerate(successes):
        hit[i, : s.size], tried[i, : s.size] = s, 1.0
    success = np.array([np.mean(s) for s in successes])
    given = _given_weather(success, _common_part(success, hit, tried))
    chance = np.zeros((NODES, n + 1))
    chance[:, 0] = 1.0
    for i in range(n):
        gained = chance[:, : i + 1] * given[:, i : i + 1]
        chance[:, : i + 1] -= gained
        chance[:, 1 : i + 2] += gained
    chances = chance.mean(axis=0)
    below = np.cumsum(chances)
    lo, median, hi = (int(np.argmax(below >= q - 1e-12)) for q in (0.1, 0.5, 0.9))
    return LagsDistribution(float(success.sum()), lo, median, hi, tuple(chances.tolist()))


def _given_weather(success: NDArray[np.float64], common: float) -> NDArray[np.float64]:
    """Return each target's success in each of the kinds of weather, (nodes, targets)."""
    weather = ndtri((np.arange(NODES) + 0.5) / NODES)
    odds = ndtri(success) + np.sqrt(common) * weather[:, None]
    return np.asarray(ndtr(odds / np.sqrt(1 - common)), dtype=float)


def _common_part(
    success: NDArray[np.float64], hit: NDArray[np.float64], tried: NDArray[np.float64]
) -> float:
    """Return the correlation that gives the covariances of the trials that pairs share."""
    shared = tried @ tried.T
    np.fill_diagonal(shared, 0.0)
    weight, enough = np.where(shared > 1, shared, 0.0), np.maximum(shared, 2.0)
    own = hit @ tried.T
    seen = float(np.sum(weight * (hit @ hit.T - own * own.T / enough) / (enough - 1)))

    def excess(common: float) -> float:
        given = _given_weather(success, common)
        away = given - given.mean(axis=0)
        return float(np.sum(weight * (away.T @ away))) / NODES - seen

    if seen <= 0:
        return 0.0
    return 0.99 if excess(0.99) <= 0 else float(brentq(excess, 0.0, 0.99, xtol=1e-6))
