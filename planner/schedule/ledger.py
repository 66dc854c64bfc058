"""The time that has been given away on telescopes and in streams."""

from __future__ import annotations

from dataclasses import dataclass, field

from planner.model.campaign import Campaign
from planner.model.observatory import TimeAllotment

__all__ = ["Ledgers"]

SLACK_H = 1e-9
"""Against rounding."""


@dataclass
class _Account:
    """Time spent against one allotment."""

    allotment: TimeAllotment
    hours: float = 0.0
    nights: int = 0
    charged: float = 0.0
    """Hours charged for the night under way."""
    worked: float = 0.0
    """Hours really worked in it; 0: not used yet."""

    def cost(self, hours: float) -> float:
        """Return what more hours tonight would add to the charge."""
        after = max(self.worked + hours, self.allotment.least_hours_per_night)
        return after - self.charged

    def allows(self, hours: float) -> bool:
        a = self.allotment
        return (
            (a.hours is None or self.hours + self.cost(hours) <= a.hours + SLACK_H)
            and (a.hours_per_night is None or self.worked + hours <= a.hours_per_night + SLACK_H)
            and (a.nights is None or self.worked > 0.0 or self.nights < a.nights)
        )

    def book(self, hours: float) -> None:
        cost = self.cost(hours)
        self.nights += self.worked == 0.0
        self.worked += hours
        self.charged += cost
        self.hours += cost

    def new_night(self) -> None:
        self.charged = self.worked = 0.0


@dataclass
class Ledgers:
    """All accounts of a campaign, and the visits of the night under way on each telescope."""

    campaign: Campaign
    telescopes: dict[str, _Account] = field(init=False)
    streams: dict[str, _Account] = field(init=False)
    booked: dict[str, list[tuple[float, float]]] = field(init=False)
    """By telescope: start and end of tonight's visits, in order."""
    _standards: set[tuple[str, str]] = field(default_factory=set)

    def __post_init__(self) -> None:
        """Open the accounts."""
        c = self.campaign
        self.telescopes = {t.name: _Account(t.time) for t in c.telescopes}
        self.streams = {s.kind: _Account(s.time) for s in (c.line, c.continuum)}
        self.booked = {t.name: [] for t in c.telescopes}

    def new_night(self) -> None:
        """Begin a night."""
        for account in (*self.telescopes.values(), *self.streams.values()):
            account.new_night()
        for visits in self.booked.values():
            visits.clear()
        self._standards.clear()

    def _hours(self, telescope: str, stream: str, visit_h: float, standards_h: float) -> float:
        """Return the hours of a visit, with the night's standard stars where it is the first."""
        return visit_h + (0.0 if (telescope, stream) in self._standards else standards_h)

    def allows(self, telescope: str, stream: str, visit_h: float, standards_h: float) -> bool:
        """Say whether the allotments leave room for one more visit tonight."""
        hours = self._hours(telescope, stream, visit_h, standards_h)
        return self.telescopes[telescope].allows(hours) and self.streams[stream].allows(hours)

    def book(
        self, telescope: str, stream: str, start_mjd: float, end_mjd: float, standards_h: float
    ) -> None:
        """Charge a visit."""
        hours = self._hours(telescope, stream, (end_mjd - start_mjd) * 24, standards_h)
        self._standards.add((telescope, stream))
        self.telescopes[telescope].book(hours)
        self.streams[stream].book(hours)
        self.booked[telescope] = sorted([*self.booked[telescope], (start_mjd, end_mjd)])
