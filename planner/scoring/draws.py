"""Everything random of one trial: truth, sky, fluxes and noise."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import accumulate
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.base.seeds import stream
from planner.lightcurves import (
    continuum_flux,
    disturbed_noise,
    draw_disturbed_pair,
    draw_pair,
    line_flux,
)
from planner.model.campaign import Campaign, Simulation, SuccessRule
from planner.model.disturbance import DISTURBANCES
from planner.model.observatory import WeatherClimate
from planner.model.trial import FeedNights, Prospect
from planner.weather import clear_nights

__all__ = [
    "UNRELATED",
    "Draw",
    "Measured",
    "Setting",
    "draw_strangers",
    "draw_trial",
    "normals_of",
    "setting_of",
    "sky_of_trial",
    "truth_of",
]

Floats = NDArray[np.float64]

UNRELATED = 3
"""Unrelated lines drawn in each trial to set a limit; one more stands in for the line itself where
a line that knows nothing is asked for."""

UNLIKE = 0.1
"""Spread of the scales and zero points of telescopes that join a stream, over the mean flux."""


@dataclass(frozen=True, slots=True)
class Setting:
    """What all targets of a campaign share; sent to the workers with every task."""

    seed: int
    first_night: int
    nights: int
    climates: tuple[tuple[str, WeatherClimate], ...]
    telescopes: tuple[tuple[str, str, float], ...]
    """Name, site and share of nights lost to other things than weather."""
    simulation: Simulation
    success: SuccessRule
    disturbance: str = "none"
    """Key of `planner.model.disturbance.DISTURBANCES`."""
    unrelated: bool = False
    """The line varies like the continuum but knows nothing of it: what is claimed is false."""


def setting_of(campaign: Campaign) -> Setting:
    """Return what all trials of a campaign share."""
    return Setting(
        seed=campaign.seed,
        first_night=campaign.first_night,
        nights=campaign.last_night - campaign.first_night + 1,
        climates=tuple((s.name, s.weather) for s in campaign.sites),
        telescopes=tuple((t.name, t.site, t.technical_loss) for t in campaign.telescopes),
        simulation=campaign.simulation,
        success=campaign.success,
    )


class Measured(NamedTuple):
    """Fluxes and errors on every night on offer of one telescope."""

    flux: Floats
    error: Floats


@dataclass(frozen=True, slots=True)
class Draw:
    """One trial's truth, and its fluxes on every night on offer, whatever the layout."""

    lag_obs_d: float
    usable: dict[str, NDArray[np.bool_]]
    """By telescope: usable nights, counted from the campaign's first."""
    continuum: tuple[Measured, ...]
    """By telescope, as in the prospect."""
    line: tuple[Measured, ...]


class Truth(NamedTuple):
    """What one trial's AGN does, observed frame."""

    lag_d: float
    amplitude_mag: float
    timescale_d: float
    width_d: float
    """Full width of the top-hat response."""


def truth_of(setting: Setting, prospect: Prospect, trial: int) -> Truth:
    """Draw a trial's lag, amplitude and timescale about the forecast, and the response's width."""
    forecast = prospect.forecast
    lag_z, amplitude_z, timescale_z = normals_of(setting, prospect, trial)
    lag = forecast.lag_obs_d * 10 ** (forecast.lag_scatter_dex * lag_z)
    share = stream(setting.seed, "response", forecast.name, trial).uniform(
        *setting.simulation.response_width
    )
    return Truth(
        lag_d=lag,
        amplitude_mag=forecast.amplitude_mag * 10 ** (forecast.amplitude_scatter_dex * amplitude_z),
        timescale_d=forecast.timescale_obs_d * 10 ** (forecast.timescale_scatter_dex * timescale_z),
        width_d=lag * share,
    )


def normals_of(setting: Setting, prospect: Prospect, trial: int) -> Floats:
    """Return the standard normals of a trial's lag, amplitude and timescale, (3,)."""
    return stream(setting.seed, "truth", prospect.forecast.name, trial).standard_normal(3)


def draw_trial(setting: Setting, prospect: Prospect, trial: int) -> Draw:
    """Draw everything random of one trial of one target, except the resampling of its errors.

    Lag, amplitude and timescale are log-normal about the forecast; the top-hat response's width
    is a uniform share of the lag. Each night on offer has its own flux and noise, whatever layout
    uses it. The scale error of a spectrum is one number for all that is measured in it. Telescopes
    that join a stream have scales and zero points of their own. Noise disturbances act on the part
    of the errors that is not shared.
    """
    return _draws(setting, prospect, trial, (UNRELATED if setting.unrelated else None,))[0]


def draw_strangers(setting: Setting, prospect: Prospect, trial: int) -> tuple[Draw, ...]:
    """Draw a trial with other lines: they vary like its own and know nothing of the continuum."""
    return _draws(setting, prospect, trial, range(UNRELATED))


def _draws(
    setting: Setting, prospect: Prospect, trial: int, lines: Iterable[int | None]
) -> tuple[Draw, ...]:
    """Draw a trial once with each line: an unrelated one by its number, or None for its own."""
    forecast, name = prospect.forecast, prospect.forecast.name
    truth, scale = truth_of(setting, prospect, trial), _scale(setting, prospect, trial)
    x, y = draw_disturbed_pair(
        stream(setting.seed, "driver", name, trial),
        *_times(setting, prospect),
        truth.timescale_d,
        truth.lag_d,
        truth.width_d,
        DISTURBANCES[setting.disturbance],
    )
    light = continuum_flux(x, truth.amplitude_mag, forecast.agn_fraction)
    continuum = _measured(setting, prospect.continuum, light, scale, "continuum", name, trial)
    usable = sky_of_trial(setting, trial)

    def line(number: int | None) -> tuple[Measured, ...]:
        kind, echo = "line", y
        if number is not None:
            kind, echo = f"unrelated {number}", _stranger(setting, prospect, trial, number, truth)
        flux = line_flux(echo, truth.amplitude_mag, setting.simulation.responsivity)
        return _measured(setting, prospect.line, flux, scale, kind, name, trial)

    return tuple(Draw(truth.lag_d, usable, continuum, line(number)) for number in lines)


def _stranger(
    setting: Setting, prospect: Prospect, trial: int, number: int, truth: Truth
) -> Floats:
    """Return the response, on the line's nights, to a driver of its own."""
    rng = stream(setting.seed, f"unrelated {number}", prospect.forecast.name, trial)
    _, times = _times(setting, prospect)
    return draw_pair(rng, times[:0], times, truth.timescale_d, truth.lag_d, truth.width_d)[1]


def _times(setting: Setting, prospect: Prospect) -> tuple[Floats, Floats]:
    """Return the times of all visits on offer, continuum and line, from the first night on."""
    return (
        _all(n.best_mjd for n in prospect.continuum) - setting.first_night,
        _all(n.best_mjd for n in prospect.line) - setting.first_night,
    )


def _scale(setting: Setting, prospect: Prospect, trial: int) -> list[Floats]:
    """Return what each night's spectra have in common, by telescope; nothing where nothing has."""
    if not any(n.scale_error for n in (*prospect.line, *prospect.continuum)):
        return []
    nights = sum(n.night.size for n in prospect.line)
    normal = stream(setting.seed, "scale", prospect.forecast.name, trial).standard_normal(nights)
    return _by_feed(prospect.line, normal)


def _all(parts: Iterable[Floats]) -> Floats:
    return np.concatenate(list(parts))


def _by_feed(feeds: Sequence[FeedNights], values: Floats) -> list[Floats]:
    """Cut values over all nights of a stream into those of each telescope."""
    ends = list(accumulate(n.night.size for n in feeds))
    return [values[a:b] for a, b in zip([0, *ends], ends, strict=False)]


def _measured(
    setting: Setting,
    feeds: Sequence[FeedNights],
    truth: Floats,
    scale: Sequence[Floats],
    kind: str,
    name: str,
    trial: int,
) -> tuple[Measured, ...]:
    """Return what each telescope of a stream measures on each of its nights."""
    disturbance = DISTURBANCES[setting.disturbance]
    noise = stream(setting.seed, f"noise {kind}", name, trial).standard_normal(truth.size)
    deviates = _by_feed(feeds, noise)
    if not disturbance.keeps_noise:
        otherwise = stream(setting.seed, f"disturbed noise {kind}", name, trial)
        deviates = [
            disturbed_noise(otherwise, feed.best_mjd, z, disturbance)
            for feed, z in zip(feeds, deviates, strict=True)
        ]
    unlike = np.zeros((1, 2))
    if len(feeds) > 1:
        joining = stream(setting.seed, f"joining {kind}", name, trial)
        unlike = UNLIKE * np.tanh(joining.standard_normal((len(feeds), 2)))
    parts = []
    for i, (feed, flux, z) in enumerate(zip(feeds, _by_feed(feeds, truth), deviates, strict=True)):
        own = np.sqrt(np.maximum(feed.flux_error**2 - feed.scale_error**2, 0.0)) * z
        shared = _shared_error(feed, i, scale)
        gain, zero = (1.0, 0.0) if i == 0 else (1.0, 0.0) + unlike[i]
        parts.append(Measured(gain * (flux * (1.0 + shared) + own) + zero, gain * feed.flux_error))
    return tuple(parts)


def _shared_error(feed: FeedNights, number: int, scale: Sequence[Floats]) -> Floats | float:
    """Return the relative error that each night has in common with all of its spectrum."""
    if feed.scale_error == 0.0:
        return 0.0
    spectrum = number if feed.in_spectra_of is None else feed.in_spectra_of
    return feed.scale_error * scale[spectrum]


def sky_of_trial(setting: Setting, trial: int) -> dict[str, NDArray[np.bool_]]:
    """Return each telescope's usable nights in one trial; the arrays cannot be written to.

    The weather of a site is the same for every target and telescope; what is lost to technical
    trouble is drawn night by night for each telescope.
    """
    names = (name for name, _, _ in setting.telescopes)
    usable = _usable_nights(
        setting.seed,
        setting.first_night,
        setting.nights,
        setting.climates,
        setting.telescopes,
        trial,
    )
    return dict(zip(names, usable, strict=True))


@lru_cache(maxsize=1024)
def _usable_nights(
    seed: int,
    first_night: int,
    count: int,
    climates: tuple[tuple[str, WeatherClimate], ...],
    telescopes: tuple[tuple[str, str, float], ...],
    trial: int,
) -> tuple[NDArray[np.bool_], ...]:
    """Return the usable nights by telescope; kept, because all targets and layouts share them."""
    nights = np.arange(first_night, first_night + count)
    clear = {
        site: clear_nights(
            climate, nights, stream(seed, "weather", site, trial).uniform(size=(1, count))
        )[0]
        for site, climate in climates
    }
    usable = tuple(
        clear[site] & (stream(seed, "technical", name, trial).uniform(size=count) >= loss)
        for name, site, loss in telescopes
    )
    for nights_of_one in usable:
        nights_of_one.setflags(write=False)
    return usable
