"""The advice: which layout for each target, why, what limits it and what would help.

In: settled races of layouts, and the campaign to try changes on. Out: one recommendation per
target, and the best subset of targets for a number of hours. The advised layout is the cheapest
whose success reaches the goal with 90 % confidence.
"""

from planner.recommend.advise import advise, advise_without_help
from planner.recommend.choose import choose, hardened, recommend
from planner.recommend.lists import lists_of
from planner.recommend.sensitive import sensitivities_of

__all__ = [
    "advise",
    "advise_without_help",
    "choose",
    "hardened",
    "lists_of",
    "recommend",
    "sensitivities_of",
]
