"""Quality cuts by name, in the file's own language."""

from __future__ import annotations

from typing import Any

from planner.base.quantities import in_unit
from planner.campaign.schema import SuccessSection
from planner.campaign.settle import Choices
from planner.model.campaign import SuccessRule

__all__ = ["CUTS", "cuts_named", "success_rule"]

CUTS = {
    # finds more lags, and more wrong ones
    "exploratory": {
        "error_below": "50 %", "r_max_above": "0.4", "sigma_above": "1",
        "in_peak_above": "40 %", "false_alarm_below": "20 %", "agree": "no",
    },
    # near what most campaigns have asked: r_max over 0.4 to 0.55, two sigma from zero, half or
    # more of the probability in the primary peak (Homayouni et al. 2020; the cuts from memory)
    "usual": {
        "error_below": "30 %", "r_max_above": "0.5", "sigma_above": "2",
        "in_peak_above": "50 %", "false_alarm_below": "5 %", "agree": "no",
    },
    # hardly a wrong lag; the methods must agree (our choice)
    "strict": {
        "error_below": "25 %", "r_max_above": "0.6", "sigma_above": "3",
        "in_peak_above": "70 %", "false_alarm_below": "1 %", "agree": "yes",
    },
}  # fmt: skip


def cuts_named(name: str) -> SuccessRule:
    """Return the rule with the cuts of that name; the rest of it does not matter to them."""
    values: dict[str, Any] = {
        key: usual == "yes" if key == "agree" else _number(usual)
        for key, usual in CUTS[name].items()
    }
    return SuccessRule(goal=0.8, within=0.3, **values)


def _number(text: str) -> float:
    return in_unit(text, "", "") if "%" in text else float(text)


def success_rule(section: SuccessSection, choices: Choices) -> SuccessRule:
    """Return the rule; cuts that are not given are those of the named set, and noted."""
    values: dict[str, Any] = {}
    for key, usual in CUTS[section.cuts].items():
        given = getattr(section, key)
        if given is None:
            choices.take(f"success.{key}", usual, f"the {section.cuts} cuts")
            given = usual if key == "agree" else _number(usual)
        values[key] = given == "yes" if key == "agree" else float(given)
    return SuccessRule(
        goal=section.goal, within=section.within, robust_to=section.robust_to, **values
    )
