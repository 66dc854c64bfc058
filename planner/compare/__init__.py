"""Scenarios side by side, on the same draws.

In: each scenario's trials, scores and recommendations. Out: what each costs and yields, and the
paired difference from the first scenario with its interval. Scenarios share lag, variability and
weather draws wherever target, site and seed are the same, so differences are not noise.
"""

from planner.compare.scenarios import Scenario, ScenarioResult, compare_scenarios

__all__ = ["Scenario", "ScenarioResult", "compare_scenarios"]
