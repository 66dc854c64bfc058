"""Whole-campaign night assignment: every visit of every target on its telescope.

In: prospects, layouts, telescopes' time. Out: visits that never leave their window, never overlap
on a telescope and keep the allotments, and what found no room. The most overdue visit goes first.
The same rule run under simulated weather says which visits the campaign would really get.
"""

from planner.schedule.assign import assign, planned, used_nights
from planner.schedule.requests import Request, requests_of
from planner.schedule.spent import hours_by_target, time_spent

__all__ = [
    "Request",
    "assign",
    "hours_by_target",
    "planned",
    "requests_of",
    "time_spent",
    "used_nights",
]
