from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner import pipeline
from planner.model.campaign import Layout
from planner.model.sky import Season
from planner.scoring import layouts_of, observe_sky, offer_of
from planner.scoring.candidates import between, deepened


def generated(campaign, prospect, lag_d):
    free = replace(
        campaign,
        season_lengths_d=(),
        seasons=(),
        line=replace(campaign.line, cadence_nights=()),
        continuum=replace(campaign.continuum, cadence_nights=()),
    )
    return layouts_of(free, replace(prospect, forecast=replace(prospect.forecast, lag_obs_d=lag_d)))


def test_all_combinations_of_the_observers_candidates(campaign, prospect):
    layouts = layouts_of(campaign, prospect)
    assert len(layouts) == len(set(layouts)) == 4
    assert {(x.cadence_line_nights, x.season_length_d) for x in layouts} == {
        (c, d) for c in (3.0, 6.0) for d in (60.0, 120.0)
    }


def test_images_are_at_least_as_dense_as_spectra(campaign, prospect):
    dense = replace(campaign, continuum=replace(campaign.continuum, cadence_nights=(2.0, 4.0)))
    pairs = {
        (x.cadence_line_nights, x.cadence_continuum_nights) for x in layouts_of(dense, prospect)
    }
    assert pairs == {(3.0, 2.0), (6.0, 2.0), (6.0, 4.0)}


def test_a_continuum_from_spectra_has_their_cadence(campaign, prospect):
    alone = replace(campaign, continuum=replace(campaign.continuum, feeds=(), in_spectra=True))
    pairs = {
        (x.cadence_line_nights, x.cadence_continuum_nights) for x in layouts_of(alone, prospect)
    }
    assert pairs == {(3.0, 3.0), (6.0, 6.0)}


@pytest.mark.parametrize("lag_d", [0.5, 4.0, 30.0, 250.0, 3000.0])
def test_generated_layouts_suit_lag_and_season(campaign, prospect, lag_d):
    layouts = generated(campaign, prospect, lag_d)
    visible = max(s.last - s.first + 1 for s in prospect.seasons)
    assert 2 <= len(layouts) <= 72
    for x in layouts:
        assert 1 <= x.cadence_continuum_nights <= max(x.cadence_line_nights, 1)
        assert x.cadence_line_nights <= max(1.0, 1.3 * lag_d / 4)
        assert 20 <= x.season_length_d <= visible
    assert max(x.season_length_d for x in layouts) == visible


def test_a_lag_longer_than_the_season_is_given_more_seasons(campaign, prospect):
    years = tuple(Season(0, 365 * y, 365 * y + 150, 150, 200) for y in range(5))
    several = replace(prospect, seasons=years)
    assert {x.seasons for x in generated(campaign, several, 20.0)} == {1, 2}
    assert {x.seasons for x in generated(campaign, several, 400.0)} == {1, 3, 5}


def test_exposures_and_shifts_are_candidates_too(campaign):
    wide = replace(
        campaign,
        season_shifts_d=(0.0, 30.0),
        line=replace(campaign.line, deepen=(1.0, 4.0)),
    )
    forecasts = pipeline.forecast_targets(wide)
    offer = offer_of(wide, 0, forecasts[0], observe_sky(wide))
    assert len(offer.layouts) == 16
    plain, deep = (offer.prospect(Layout(3.0, 1.0, 60.0, 1, 0.0, factor)) for factor in (1.0, 4.0))
    assert deep.line[0].exposure_s == 4 * plain.line[0].exposure_s
    assert (deep.line[0].flux_error.min()) < plain.line[0].flux_error.min()
    assert deep.continuum[0].exposure_s == plain.continuum[0].exposure_s
    assert offer.plain is plain


def test_found_exposures_grow_as_well(campaign):
    feed = replace(campaign.line.feeds[0], exposure_s=None, wanted_error=0.04, longest_s=1800.0)
    auto = replace(campaign, line=replace(campaign.line, feeds=(feed,)))
    (deeper,) = deepened(auto, 4.0, 1.0).line.feeds
    assert (deeper.exposure_s, deeper.wanted_error, deeper.longest_s) == (None, 0.02, 7200.0)


GRID = tuple(Layout(c, 1.0, d, 1) for c in (2.0, 4.0, 8.0) for d in (60.0, 120.0))


@given(st.sampled_from(GRID))
def test_what_lies_between_is_cheaper_in_one_thing_and_stays_within_the_grid(best):
    for near in between(GRID, best):
        changed = [
            name
            for name in ("cadence_line_nights", "cadence_continuum_nights", "season_length_d")
            if getattr(near, name) != getattr(best, name)
        ]
        assert len(changed) == 1
        assert near.cadence_line_nights >= best.cadence_line_nights
        assert near.season_length_d <= best.season_length_d
        assert near.cadence_continuum_nights <= near.cadence_line_nights
        assert near not in GRID


def test_thirds_of_the_way_to_the_next_candidate():
    found = between(GRID, Layout(4.0, 1.0, 120.0, 1))
    assert Layout(5.0, 1.0, 120.0, 1) in found
    assert Layout(6.5, 1.0, 120.0, 1) in found
    assert Layout(4.0, 1.0, 95.0, 1) in found
    assert Layout(4.0, 1.0, 75.0, 1) in found
