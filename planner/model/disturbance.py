"""What may go otherwise than the recovery of lags takes for granted, one named record each."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["DISTURBANCES", "Disturbance"]


@dataclass(frozen=True, slots=True)
class Disturbance:
    """How one kind of trial differs from an ordinary one; every default is the ordinary trial."""

    name: str
    meaning: str
    """In plain words, for the report."""
    source: str
    """Where the numbers come from."""
    response: Literal["top hat", "shell", "long tail"] = "top hat"
    """``top hat``: of the width drawn for the trial; ``shell``: uniform over delays from 0 to
    twice the lag; ``long tail``: delay times exponential, peak at half the lag. Mean: the lag."""
    driver_slope: float = 2.0
    """Steepness of the driver's power spectrum, ``1 / (1 + (2 pi f tau)^slope)``, > 1; 2 is the
    damped random walk."""
    decoupled_share: float = 0.0
    """Share of each season in which the line keeps the value it had, in [0, 1)."""
    trend: float = 0.0
    """Straight-line change of the line from its first to its last epoch that no continuum caused,
    in rms of the driver; its sign is drawn."""
    correlated_share: float = 0.0
    """Share of the error's variance that nights near each other have in common, in [0, 1]."""
    correlation_time_d: float = 0.0
    """Time over which that correlation falls to 1/e, > 0 where there is any."""
    outlier_share: float = 0.0
    """Chance that a measurement is an outlier, in [0, 1]."""
    outlier_sigma: float = 0.0
    """Rms of what is added to an outlier, in true errors."""
    error_factor: float = 1.0
    """True error over the quoted one."""

    @property
    def keeps_noise(self) -> bool:
        """The quoted errors hold: independent, Gaussian and of the right size."""
        return self.correlated_share == 0.0 and self.outlier_share == 0.0 and self.error_factor == 1


_UNSOURCED = "size: common practice, no source"

_TABLE = (
    Disturbance("none", "an ordinary trial", "the campaign file"),
    Disturbance(
        "wide response",
        "the line answers over all delays from zero to twice the lag, as a thin shell does",
        "geometry: a thin shell that shines alike in all directions",
        response="shell",
    ),
    Disturbance(
        "skewed response",
        "most of the line answers early and a long tail of it late; the mean delay is the lag",
        f"gamma density of shape 2; {_UNSOURCED}",
        response="long tail",
    ),
    Disturbance(
        "line stops following",
        "in a third of each season the line keeps the value it had",
        "60 to 70 of some 180 days: NGC 5548 in 2014, Goad et al. 2016, ApJ 824, 11, from memory",
        decoupled_share=0.35,
    ),
    Disturbance(
        "power-law variability",
        "the continuum is smoother from night to night than a damped random walk",
        "slopes of -2.6 to -3.3 in Kepler data: Mushotzky et al. 2011, arXiv:1111.0672, abstract",
        driver_slope=3.0,
    ),
    Disturbance(
        "slow trend",
        "the line drifts by one rms of the continuum, unrelated to it, from first to last night",
        _UNSOURCED,
        trend=1.0,
    ),
    Disturbance(
        "outliers",
        "one measurement in twenty is off by about eight times its error",
        _UNSOURCED,
        outlier_share=0.05,
        outlier_sigma=8.0,
    ),
    Disturbance(
        "underestimated errors",
        "true errors are one and a half times the quoted ones",
        _UNSOURCED,
        error_factor=1.5,
    ),
    Disturbance(
        "correlated errors",
        "half of the error's variance has a memory of five nights",
        _UNSOURCED,
        correlated_share=0.5,
        correlation_time_d=5.0,
    ),
)

DISTURBANCES: dict[str, Disturbance] = {d.name: d for d in _TABLE}
"""By the name that a campaign file uses; the first, ``none``, changes nothing."""
