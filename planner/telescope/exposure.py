"""The exposure that reaches a wanted error."""

from __future__ import annotations

import math
from bisect import bisect_left
from collections.abc import Callable

__all__ = ["exposure_for"]

STEP_S = 10


def exposure_for(
    error_of: Callable[[float], float], wanted_error: float, shortest_s: float, longest_s: float
) -> tuple[float, bool]:
    """Return the shortest exposure in whole 10 s that reaches an error, and whether one does.

    Parameters
    ----------
    error_of : callable
        Error of an exposure in seconds; must not grow with the exposure.
    wanted_error : float
        The error to reach.
    shortest_s, longest_s : float
        Least and most exposure allowed. `longest_s` itself is tried although it may be no whole
        10 s, and is returned, with False, if even it fails.
    """
    first, last = max(math.ceil(shortest_s / STEP_S), 1), math.floor(longest_s / STEP_S)
    steps = range(first, last + 1)
    found = bisect_left(
        steps, True, key=lambda step: bool(error_of(float(step * STEP_S)) <= wanted_error)
    )
    if found < len(steps):
        return float(steps[found] * STEP_S), True
    return longest_s, bool(error_of(longest_s) <= wanted_error)
