"""Choosing a layout and saying why."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import replace

from planner.model.campaign import SuccessRule
from planner.model.plan import Cause, Help, Opinion, Recommendation
from planner.model.trial import Score, TrialTable
from planner.scoring import HOPELESS, REASONS

__all__ = ["choose", "hardened", "hopeless", "recommend"]


def choose(scores: Sequence[Score], rule: SuccessRule) -> tuple[Score | None, bool]:
    """Return the advised layout's score and whether it reaches the goal.

    The cheapest layout in clock hours whose success is at or above the goal with 90 % confidence;
    if there is none, the one with the highest lower bound of success (the highest success where
    all had as many trials), of equals the most promising by the forecast. None if nothing could be
    tried.
    """
    tried = [s for s in scores if s.trials > 0]
    if not tried:
        return None, False
    good = [s for s in tried if s.success_lo >= rule.goal]
    if good:
        return min(good, key=lambda s: (s.hours, -s.success)), True
    return min(tried, key=lambda s: (-s.success_lo, -s.success, -s.promise, s.hours)), False


def hopeless(best: Score, rule: SuccessRule) -> bool:
    """Say whether even the best layout of a target is shown to stay far below the goal."""
    return best.success_hi < HOPELESS * rule.goal


def recommend(
    target: str,
    scores: Sequence[Score],
    table: TrialTable,
    rule: SuccessRule,
    helps: Sequence[Help] = (),
    causes: Sequence[Cause] = (),
) -> Recommendation:
    """Return the recommendation for one target, with the reason in words.

    Parameters
    ----------
    target : str
    scores : sequence of Score
        One per layout, in the order of ``table.layouts``.
    table : TrialTable
    rule : SuccessRule
    helps : sequence of Help
        Changes tried on the best layout where the goal is missed, the most worth first.
    causes : sequence of Cause
        What its failed trials fail for want of.
    """
    best, reached = choose(scores, rule)
    if best is None:
        notes = sorted({s.note for s in scores})
        return Recommendation(target, "leave out", None, "; ".join(notes) or "no layout", ())
    if reached:
        cheaper = sum(s.trials > 0 and s.hours < best.hours for s in scores)
        why = (
            f"cheapest layout with success of at least {rule.goal:.0%} at 90 % confidence; "
            f"{cheaper} cheaper {'layout misses' if cheaper == 1 else 'layouts miss'} it"
        )
        return Recommendation(target, "observe", best, why, (), tuple(causes))
    ranked = tuple(helps)
    if best.success >= rule.goal:
        why = (
            f"no layout is shown to reach the goal of {rule.goal:.0%}: {best.trials} trials leave "
            f"{best.success_lo:.0%} to {best.success_hi:.0%}; more trials may settle it"
        )
    else:
        why = (
            f"no layout reaches the goal of {rule.goal:.0%}; this is the best; "
            f"{_limits(table, best)}"
        )
    if best.note:
        why += f"; {best.note}"
    sure = [h for h in ranked if h.gain_lo > 0]
    if sure:
        most = max(sure, key=lambda h: h.gain)
        why += (
            f"; what would help most for the time: {sure[0].change} (success {sure[0].success:.0%},"
            f" {sure[0].hours:+.0f} h)"
        )
        if most is not sure[0]:
            why += (
                f", and whatever the time: {most.change} ({most.success:.0%}, {most.hours:+.0f} h)"
            )
    elif ranked:
        why += "; none of the changes tried is shown to help"
    decision = "leave out" if hopeless(best, rule) else "risky"
    return Recommendation(target, decision, best, why, ranked, tuple(causes))


def hardened(
    advice: Recommendation, opinions: Sequence[Opinion], rule: SuccessRule
) -> Recommendation:
    """Return the advice as it stands under the disturbances that the rule asks to withstand.

    A target that reaches the goal undisturbed but not, with 90 % confidence, under a named
    disturbance is risky.
    """
    broken = [
        o
        for o in opinions
        if o.target == advice.target and o.what in rule.robust_to and o.success_lo < rule.goal
    ]
    if advice.decision != "observe" or not broken:
        return advice
    words = ", ".join(f"{o.what} ({o.success:.0%})" for o in broken)
    return replace(advice, decision="risky", why=f"{advice.why}; but not robust to {words}")


def _limits(table: TrialTable, score: Score) -> str:
    """Say what the failed trials failed of, commonest first."""
    at = table.layouts.index(score.layout)
    trials = int(table.trials[at])
    failed = Counter(int(r) for r in table.reason[at, :trials] if r > 0)
    commonest = sorted(failed.items(), key=lambda item: (-item[1], item[0]))[:2]
    return "trials fail mostly of: " + ", ".join(
        f"{REASONS[reason]} ({count / trials:.0%})" for reason, count in commonest
    )
