"""The results of planning: recommendations, visits and the whole plan."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from planner.model.campaign import Campaign, Layout
from planner.model.sky import Nights, Windows
from planner.model.target import Forecast
from planner.model.trial import Prospect, Score, TrialTable

__all__ = [
    "Cause", "Help", "Opinion", "Plan", "Recommendation", "Sensitivity", "SiteSky", "Subset",
    "TimeSpent", "Unplaced", "Visit",
]  # fmt: skip


@dataclass(frozen=True, slots=True)
class SiteSky:
    """Nights of one site and the windows of all targets in them."""

    nights: Nights
    windows: Windows
    """Within the campaign's limits."""
    moonless: Windows
    """The same with the moon below the horizon; without rows where no stream has a moon limit."""


@dataclass(frozen=True, slots=True)
class Help:
    """One change to a layout that misses the goal, and what it would bring."""

    change: str
    success: float
    gain: float
    """Paired: the same draws with and without the change."""
    gain_lo: float
    gain_hi: float
    """Each holds with 90 % confidence."""
    hours: float
    """Clock hours added."""
    trials: int

    @property
    def per_hour(self) -> float:
        """Return the gain per added hour; less than an hour counts as one."""
        return self.gain / max(self.hours, 1.0)


@dataclass(frozen=True, slots=True)
class Cause:
    """What the failed trials of a layout fail for want of."""

    want: str
    share: float
    """Of the failed trials."""


@dataclass(frozen=True, slots=True)
class Sensitivity:
    """Success of a layout where one factor is held and the others are as they may be."""

    factor: str
    """``lag``, ``amplitude``, ``timescale``, ``weather`` or ``relation``."""
    level: str
    """Of the factor's 10th, 50th and 90th percentile; or the relation's key."""
    value: float
    """Standard normal deviate of the logarithm; usable nights; or the relation's lag in days."""
    success: float
    success_lo: float
    success_hi: float
    """Both ends hold together with 90 % confidence; NaN, as `success`, where the trials made say
    nothing of this value."""


@dataclass(frozen=True, slots=True)
class Subset:
    """The targets that give the most lags for a number of clock hours, each with a layout."""

    hours: float
    chosen: tuple[tuple[str, Layout], ...]
    lags: float
    """Expected number of right lags."""
    lags_lo: float
    lags_hi: float
    """10th and 90th percentile: targets share the weather."""
    spent: float
    """Clock hours."""


@dataclass(frozen=True, slots=True)
class Recommendation:
    """The layout advised for one target."""

    target: str
    decision: str
    """``observe`` (goal met), ``risky`` (goal missed, still scheduled), ``leave out``."""
    score: Score | None
    """None: the target cannot be observed at all."""
    why: str
    helps: tuple[Help, ...]
    """Largest gain per added hour first; empty where the goal is met."""
    causes: tuple[Cause, ...] = ()
    """Commonest first."""

    @property
    def scheduled(self) -> bool:
        """Whether the target takes part in the schedule."""
        return self.decision in {"observe", "risky"}


@dataclass(frozen=True, slots=True)
class Opinion:
    """The recommended layout of one target, tried in another way on the same draws."""

    target: str
    what: str
    """``correlation``: recovered by it where the likelihood judges; ``likelihood``: its information
    forecast (no trials; bounds and false claims NaN) where the correlation judges; ``unrelated
    line``: a line that knows nothing of the continuum, so that every claim is false; else the name
    of a disturbance."""
    success: float
    success_lo: float
    success_hi: float
    false_claims: float
    false_claims_hi: float
    trials: int


@dataclass(frozen=True, slots=True)
class Visit:
    """One scheduled visit."""

    night: int
    """Nights since the campaign's first."""
    target: str
    stream: str
    telescope: str
    start_mjd: float
    end_mjd: float
    """Slew, exposure and overhead included."""
    exposure_s: float


@dataclass(frozen=True, slots=True)
class TimeSpent:
    """Clock time of a schedule on one telescope in one stream; all in hours."""

    telescope: str
    stream: str
    visits: int
    nights: int
    """Nights on which the telescope works for this stream."""
    shutter_hours: float
    visit_hours: float
    """Slews, acquisition, exposures, read-out and overhead."""
    standards_hours: float
    minimum_hours: float
    """Charged for nights shorter than the least, shared out by the time spent."""
    clock_hours: float
    """All of it."""
    whole_nights: float
    """Clock hours over the mean dark hours of the campaign's nights."""


@dataclass(frozen=True, slots=True)
class Unplaced:
    """Visits of one target and stream that the schedule found no room for."""

    target: str
    stream: str
    telescope: str
    wanted: int
    """Visits that the layout asks for."""
    placed: int
    reason: str


@dataclass(frozen=True, slots=True)
class Plan:
    """Everything one run of the planner found out."""

    campaign: Campaign
    forecasts: tuple[Forecast, ...]
    skies: dict[str, SiteSky]
    """By site."""
    prospects: tuple[Prospect, ...]
    trials: tuple[TrialTable, ...]
    scores: tuple[Score, ...]
    recommendations: tuple[Recommendation, ...]
    opinions: tuple[Opinion, ...]
    sensitivities: dict[str, tuple[Sensitivity, ...]]
    """By target, of the recommended layout."""
    subsets: tuple[Subset, ...]
    """Best lists of targets for several numbers of hours, ascending."""
    visits: tuple[Visit, ...]
    unplaced: tuple[Unplaced, ...]
    time_spent: tuple[TimeSpent, ...]
    hours_scheduled: dict[str, float]
    """By target: clock hours that the schedule for clear skies charges it."""
    executed: dict[str, Score]
    """By target: the schedule as the weather would let it happen."""
    run: dict[str, Any]
    """Provenance, as written to run.json."""
