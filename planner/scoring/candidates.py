"""The layouts tried for a target: the observer's candidates, generated ones, and those between."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from itertools import product

import numpy as np

from planner.model.campaign import Campaign, Layout
from planner.model.observatory import Stream
from planner.model.plan import SiteSky
from planner.model.target import Forecast
from planner.model.trial import Offer, Prospect
from planner.scoring.placing import by_year
from planner.scoring.prospects import prospect_of

__all__ = ["between", "deepened", "layouts_of", "offer_of"]

NICE = (1, 1.5, 2, 3, 4, 5, 6, 8, 10, 12, 15, 20, 25, 30, 40)
"""Cadences that are proposed, in nights."""

PER_LAG = {"line": (16, 8, 4), "continuum": (30, 15)}
"""Epochs within one lag that are proposed. A lag is resolved to about twice the sampling (Horne et
al. 2004, PASP 116, 465); the rest is common practice, no source."""

LAGS_LONG = 3.0
"""A season of this many lags is long enough (Horne et al. 2004); proposed even where it fills the
visible season."""

SHARES = (0.4, 0.6, 0.8, 1.0)
"""Shares of the visible season that are proposed."""

SHORTEST_D = 20.0

THIRDS = (1 / 3, 2 / 3)
"""Where between two candidates others are tried."""


def offer_of(
    campaign: Campaign, index: int, forecast: Forecast, skies: Mapping[str, SiteSky]
) -> Offer:
    """Return the candidate layouts of target number `index`, and what each of them can use."""
    factors = [(1.0, 1.0)]
    for pair in product(campaign.line.deepen, campaign.continuum.deepen):
        if pair not in factors:
            factors.append(pair)
    prospects = tuple(
        (pair, prospect_of(deepened(campaign, *pair), index, forecast, skies)) for pair in factors
    )
    return Offer(layouts_of(campaign, prospects[0][1]), prospects)


def deepened(campaign: Campaign, line: float, continuum: float) -> Campaign:
    """Return a campaign with the exposures of both streams multiplied."""
    return replace(
        campaign,
        line=_deepened(campaign.line, line),
        continuum=_deepened(campaign.continuum, continuum),
    )


def _deepened(stream: Stream, factor: float) -> Stream:
    """Multiply a stream's exposures; where they are found for each target, their error shrinks."""
    if factor == 1.0:
        return stream
    return replace(
        stream,
        feeds=tuple(
            replace(
                feed,
                exposure_s=None if feed.exposure_s is None else feed.exposure_s * factor,
                wanted_error=feed.wanted_error / factor**0.5,
                longest_s=feed.longest_s * factor,
            )
            for feed in stream.feeds
        ),
    )


def layouts_of(campaign: Campaign, prospect: Prospect) -> tuple[Layout, ...]:
    """Return every candidate layout of a target.

    All combinations of the observer's candidates; what was left open is generated from the
    target's expected lag and visible season. A continuum sampled more sparsely than the line is
    left out wherever a denser one is on offer: the driver must be known between the line's epochs.
    A continuum that is measured in spectra alone has the line's cadence.
    """
    lag = prospect.forecast.lag_obs_d
    lines = campaign.line.cadence_nights or _cadences(lag, "line")
    images = campaign.continuum.cadence_nights or _cadences(lag, "continuum")
    lengths = campaign.season_lengths_d or _lengths(prospect)
    seasons = campaign.seasons or _seasons(prospect)
    pairs = [
        (line, cont)
        for line in lines
        for cont in (images if campaign.continuum.feeds else (line,))
        if cont <= line or cont == images[0]
    ]
    return tuple(
        Layout(line, cont, length, number, shift, deep, deep_continuum)
        for line, cont in pairs
        for length in lengths
        for number in seasons
        for shift in campaign.season_shifts_d
        for deep in campaign.line.deepen
        for deep_continuum in campaign.continuum.deepen
    )


def _cadences(lag_d: float, kind: str) -> tuple[float, ...]:
    """Return cadences that put so many epochs within a lag."""
    wanted = [lag_d / per for per in PER_LAG[kind]]
    return _once(min(NICE, key=lambda nice: abs(np.log(nice / max(w, 1.0)))) for w in wanted)


def _lengths(prospect: Prospect) -> tuple[float, ...]:
    """Return lengths up to the whole visible season."""
    visible = _visible_d(prospect)
    lengths = [5.0 * round(visible * share / 5.0) for share in SHARES[:-1]]
    enough = LAGS_LONG * prospect.forecast.lag_obs_d
    if SHORTEST_D < enough < visible:
        lengths.append(5.0 * round(enough / 5.0))
    return _once([*(max(length, min(SHORTEST_D, visible)) for length in lengths), visible])


def _visible_d(prospect: Prospect) -> float:
    """Return the nights of the longest visible season, one that lasts for years cut by years."""
    return float(max((s.last - s.first + 1 for s in by_year(prospect.seasons)), default=SHORTEST_D))


def _seasons(prospect: Prospect) -> tuple[int, ...]:
    """Return one season, and as many as the campaign has, up to what a few lags last."""
    there = len(by_year(prospect.seasons))
    useful = np.ceil(LAGS_LONG * prospect.forecast.lag_obs_d / _visible_d(prospect)) + 1
    most = int(max(1, min(there, useful)))
    return tuple(range(1, most + 1)) if most <= 3 else (1, (1 + most) // 2, most)


def _once(values: Iterable[float]) -> tuple[float, ...]:
    return tuple(sorted({float(v) for v in values}))


def between(layouts: Sequence[Layout], best: Layout) -> tuple[Layout, ...]:
    """Return cheaper layouts between the candidates about the best, one thing changed at a time.

    Sparser spectra, sparser images, shorter seasons, shorter exposures: at thirds of the way to
    the next candidate in that direction, or of a factor 1.5 where there is none.
    """
    found = []
    for name, sense, grain in (
        ("cadence_line_nights", 1, 0.5),
        ("cadence_continuum_nights", 1, 0.5),
        ("season_length_d", -1, 5.0),
        ("exposure_line", -1, 0.05),
        ("exposure_continuum", -1, 0.05),
    ):
        now = getattr(best, name)
        further = {getattr(x, name) for x in layouts if sense * (getattr(x, name) - now) > 0}
        if name.startswith("exposure") and not further:
            continue
        bound = min(further, key=lambda v: abs(v - now)) if further else now * 1.5**sense
        for share in THIRDS:
            value = grain * round(now * (bound / now) ** share / grain)
            if sense * (value - now) > 0 and sense * (bound - value) > 0:
                found.append(replace(best, **{name: value}))
    return tuple(dict.fromkeys(c for c in found if _sensible(c)))


def _sensible(layout: Layout) -> bool:
    """Keep images at least as dense as spectra."""
    return layout.cadence_continuum_nights <= layout.cadence_line_nights
