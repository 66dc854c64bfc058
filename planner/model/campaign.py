"""The whole campaign as one record, and the layouts and rules it is judged by."""

from __future__ import annotations

from dataclasses import dataclass

from planner.model.observatory import Limits, Site, Stream, Telescope
from planner.model.target import Target

__all__ = ["Campaign", "Cosmology", "Layout", "Simulation", "SuccessRule"]


@dataclass(frozen=True, slots=True)
class Cosmology:
    """Flat LCDM."""

    hubble_km_s_mpc: float = 70.0
    omega_matter: float = 0.3


@dataclass(frozen=True, slots=True)
class SuccessRule:
    """When a recovered lag is a claim, when a claim is right, and how often that must happen."""

    goal: float
    """Wanted chance of success, in (0, 1)."""
    within: float
    """A claim is right if it lies within this fraction of the true lag."""
    error_below: float
    """Quality cut: half-width of the 68 % interval over the lag."""
    r_max_above: float
    """Quality cut: peak of the correlation function."""
    sigma_above: float
    """Quality cut: lag over its lower error, against lags consistent with zero."""
    in_peak_above: float = 0.0
    """Quality cut: share of the lag's probability in the primary peak."""
    false_alarm_below: float = 1.0
    """Quality cut: chance that an unrelated line would do as well. Correlation: its peak must be
    higher than those of all but this share of unrelated lines, simulated on the same epochs.
    Likelihood: an echo must be likelier than an unrelated line by more than one over this, which
    unrelated lines reach at most that often (Markov's inequality)."""
    agree: bool = False
    """Quality cut: the 68 % intervals of correlation and likelihood must overlap."""
    robust_to: tuple[str, ...] = ()
    """Names of disturbances, keys of `planner.model.disturbance.DISTURBANCES`, under which the
    recommended layout is tried too."""


@dataclass(frozen=True, slots=True)
class Simulation:
    """How trials are drawn."""

    trials: int
    """Trials of each layout of each target."""
    resamples: int
    """Flux-randomised random subsets drawn for each recovered lag's error."""
    responsivity: float
    """Fractional change of the line flux per fractional change of the delayed continuum."""
    response_width: tuple[float, float]
    """Range of the top-hat response's full width over the lag, drawn uniformly; at most 2."""
    method: str = "correlation"
    """Lag recovery that judges layouts: ``"correlation"`` or ``"likelihood"``."""
    detrend: bool = False
    """Take a straight line off each curve before correlating."""


@dataclass(frozen=True, slots=True)
class Layout:
    """One candidate way to observe a target."""

    cadence_line_nights: float
    cadence_continuum_nights: float
    season_length_d: float
    seasons: int
    shift_d: float = 0.0
    """Nights by which each season starts later than the best stretch of the visible season."""
    exposure_line: float = 1.0
    """Exposure over that of the stream as it stands in the campaign."""
    exposure_continuum: float = 1.0

    def __str__(self) -> str:
        """Return the layout in words; it names random streams, so it must not change."""
        words = (
            f"spectra each {self.cadence_line_nights:g}, images each "
            f"{self.cadence_continuum_nights:g} nights, {self.seasons} x {self.season_length_d:g} d"
        )
        if self.shift_d:
            words += f", {self.shift_d:+g} d"
        if self.exposures != (1.0, 1.0):
            words += f", exposures x {self.exposure_line:g} and {self.exposure_continuum:g}"
        return words

    @property
    def exposures(self) -> tuple[float, float]:
        """Return the factors of line and continuum exposures."""
        return self.exposure_line, self.exposure_continuum


@dataclass(frozen=True, slots=True)
class Campaign:
    """Everything the planner needs to know."""

    name: str
    first_night: int
    """MJD of the evening date."""
    last_night: int
    seed: int
    targets: tuple[Target, ...]
    sites: tuple[Site, ...]
    telescopes: tuple[Telescope, ...]
    continuum: Stream
    line: Stream
    limits: Limits
    season_lengths_d: tuple[float, ...]
    """Candidates; empty: generated for each target, as `seasons` and the streams' cadences."""
    seasons: tuple[int, ...]
    season_shifts_d: tuple[float, ...]
    """Candidates for `Layout.shift_d`."""
    success: SuccessRule
    simulation: Simulation
    cosmology: Cosmology
    relations: tuple[tuple[str, str], ...]
    """(line, key of its radius-luminosity relation)."""

    def telescope(self, name: str) -> Telescope:
        """Return the telescope called `name`."""
        return next(t for t in self.telescopes if t.name == name)

    def site(self, telescope: str) -> Site:
        """Return the site of the telescope called `telescope`."""
        place = self.telescope(telescope).site
        return next(s for s in self.sites if s.name == place)
