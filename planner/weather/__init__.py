"""Which nights are clear.

In: a site's climate (clear fraction of each month, mean length of bad spells), nights, and random
numbers drawn elsewhere. Out: clear or lost, for any number of trials at once.
One sequence of nights stands for everything at a site: all targets and streams share it.
"""

from planner.weather.spells import clear_nights, expected_clear, impossible

__all__ = ["clear_nights", "expected_clear", "impossible"]
