"""The advice: which layout for each target, why, and what would help where the goal is missed.

In: scores, trials, and the campaign to try changes on. Out: one recommendation per target.
The advised layout is the cheapest whose success reaches the goal with 90 % confidence.
"""

from planner.recommend.choose import choose, hardened, recommend
from planner.recommend.helps import Change, changes_for, helps_of

__all__ = ["Change", "changes_for", "choose", "hardened", "helps_of", "recommend"]
