"""Quality cuts by name, in the file's own language."""

from __future__ import annotations

from planner.base.quantities import in_unit
from planner.campaign.schema import SuccessSection
from planner.campaign.settle import Choices
from planner.model.campaign import SuccessRule

__all__ = ["CUTS", "success_rule"]

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


def success_rule(section: SuccessSection, choices: Choices) -> SuccessRule:
    """Return the rule; cuts that are not given are those of the named set, and noted."""
    values: dict[str, float | bool] = {}
    for key, usual in CUTS[section.cuts].items():
        given = getattr(section, key)
        if given is None:
            choices.take(f"success.{key}", usual, f"the {section.cuts} cuts")
            given = usual if key == "agree" else in_unit(usual, "", "") if "%" in usual else usual
        values[key] = given == "yes" if key == "agree" else float(given)
    return SuccessRule(
        goal=section.goal, within=section.within, robust_to=section.robust_to, **values
    )
