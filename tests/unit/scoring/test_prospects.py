"""Nights on offer: moon limits, exposures found, several telescopes and sites."""

from dataclasses import replace

import numpy as np
import pytest

from planner.agn import forecast as forecast_of
from planner.base.errors import InputError
from planner.model.campaign import Layout
from planner.model.observatory import (
    LineMeasurement,
    Site,
    SkyQuality,
    Spectrograph,
    Telescope,
    TimeAllotment,
    WeatherClimate,
)
from planner.pipeline import observe_sky
from planner.scoring import place_in, prospect_of, setting_of
from planner.scoring.draws import draw_trial, sky_of_trial
from planner.scoring.trials import nights_used, observe
from planner.sky import positions_at, sun_moon_at


def with_line(campaign, **options):
    (feed,) = campaign.line.feeds
    return replace(campaign, line=replace(campaign.line, feeds=(replace(feed, **options),)))


def prospect_for(campaign, forecast, index=0):
    return prospect_of(campaign, index, forecast, observe_sky(campaign))


def test_a_dark_stream_meets_no_bright_moon_that_is_up(campaign, forecast, site):
    dark = prospect_for(with_line(campaign, moon_illumination_max=0.25), forecast).line[0]
    free = prospect_for(campaign, forecast).line[0]
    moon = sun_moon_at(site, dark.best_mjd)
    # the limit is taken at midnight; the moon's light changes by up to 6 % in half a night
    assert ((moon.moon_altitude_deg < 0.3) | (moon.moon_illumination < 0.32)).all()
    assert dark.night.size < free.night.size
    bright = free.sky_ab_mag < 20.0
    assert bright.any()
    assert not (dark.sky_ab_mag < 20.0).any()
    gaps = np.diff(dark.night)
    assert gaps.max() >= 3, "bright time makes runs of nights without epochs"


@pytest.mark.parametrize("whose", ["telescope", "stream"])
def test_blocked_nights_of_telescope_and_stream_are_left_out(campaign, forecast, whose):
    first = campaign.first_night
    time = TimeAllotment(blocked=((first + 10, first + 40),))
    if whose == "telescope":
        telescopes = tuple(replace(t, time=time) for t in campaign.telescopes)
        campaign = replace(campaign, telescopes=telescopes)
    else:
        campaign = replace(campaign, line=replace(campaign.line, time=time))
    night = prospect_for(campaign, forecast).line[0].night
    assert night.size
    assert not ((night >= 10) & (night <= 40)).any()


def test_the_best_time_is_no_worse_than_that_of_least_airmass(campaign, forecast, site):
    nights = prospect_for(campaign, forecast).line[0]
    target = campaign.targets[0]
    up = positions_at(target.ra_deg, target.dec_deg, site, nights.best_mjd).altitude_deg
    assert (1 / np.sin(np.radians(up)) <= campaign.limits.airmass + 0.01).all()
    np.testing.assert_allclose(nights.airmass, 1 / np.sin(np.radians(up)), rtol=1e-9)
    half = nights.visit_s / 86400 / 2
    assert (nights.best_mjd - half >= nights.window_start_mjd - 1e-9).all()
    assert (nights.best_mjd + half <= nights.window_end_mjd + 1e-9).all()


def test_an_exposure_is_found_for_each_target(campaign, forecast):
    auto = with_line(campaign, exposure_s=None, wanted_error=0.03, longest_s=7200.0)
    easy = prospect_for(auto, forecast).line[0]
    assert easy.reached
    assert np.median(easy.flux_error) == pytest.approx(0.03, abs=0.002)
    fainter = replace(auto.targets[0], magnitude=replace(auto.targets[0].magnitude, value_mag=16.4))
    faint = prospect_for(replace(auto, targets=(fainter,)), forecast).line[0]
    assert faint.exposure_s > 2 * easy.exposure_s
    assert faint.visit_s - easy.visit_s == pytest.approx(faint.exposure_s - easy.exposure_s)
    hopeless = replace(auto.targets[0], magnitude=replace(fainter.magnitude, value_mag=22.0))
    cannot = prospect_for(replace(auto, targets=(hopeless,)), forecast).line[0]
    assert not cannot.reached
    assert cannot.exposure_s == 7200.0
    assert np.median(cannot.flux_error) > 0.03


def test_a_visit_longer_than_every_window_is_said(campaign, forecast):
    prospect = prospect_for(with_line(campaign, exposure_s=40000.0), forecast)
    assert prospect.seasons == ()
    assert prospect.note.startswith("no window holds a visit of 11 h; the longest has")


def test_narrow_lines_are_asked_for_only_where_there_are_any(campaign, forecast):
    scaled = replace(campaign.line, measurement=LineMeasurement(None, 20.0))
    campaign = replace(campaign, line=scaled)
    assert prospect_for(campaign, forecast).line[0].night.size
    with pytest.raises(InputError, match="no narrow lines lie beside MgII"):
        prospect_for(campaign, replace(forecast, line="MgII"))


def test_a_spectrograph_measures_as_its_photons_let_it(campaign, forecast):
    """Of two slits the one that the seeing fills badly measures worse."""
    wide = Spectrograph(0.2, 1.5, 6.0, 3.0, False, None, 5500.0, 0.4, 4.0, 0.002)
    errors = [
        np.median(
            prospect_for(with_line(campaign, instrument=slit, floor=0.0), forecast)
            .line[0]
            .flux_error
        )
        for slit in (wide, replace(wide, slit_arcsec=0.5))
    ]
    assert errors[1] > 1.3 * errors[0]
    fixed = replace(wide, slit_arcsec=1.0, slit_angle_deg=0.0, guide_a=7000.0)
    along = replace(fixed, slit_angle_deg=None)
    off, on = (
        prospect_for(with_line(campaign, instrument=slit, floor=0.0), forecast).line[0]
        for slit in (fixed, along)
    )
    assert off.flux_error.max() > on.flux_error.max()


@pytest.fixture
def two_sites(campaign):
    """Images from the other side of the Earth, and a second imager beside the first."""
    other = Site(
        "Fell", -31.3, 149.1, 1100.0, None, WeatherClimate((0.5,) * 12, 3.0),
        SkyQuality(1.8, (("V", 21.4),), (("V", 0.2),)),
    )  # fmt: skip
    small = campaign.telescope("Small")
    far = Telescope("Far", "Fell", 0.5, 0.3, 30.0, 30.0, 0.1, small.time)
    feed = campaign.continuum.feeds[0]
    feeds = (replace(feed, telescope="Far"), replace(feed, floor=0.02))
    return replace(
        campaign,
        sites=(*campaign.sites, other),
        telescopes=(*campaign.telescopes, far),
        continuum=replace(campaign.continuum, feeds=feeds),
    )


def test_streams_may_sit_on_different_sites(two_sites, forecast):
    prospect = prospect_for(two_sites, forecast)
    (line,), (far, near) = prospect.line, prospect.continuum
    assert (line.site, far.site, near.site) == ("Ridge", "Fell", "Ridge")
    # nights are named by the local evening: 220 deg east of Ridge, Fell's come 14.7 h earlier
    apart = np.median(near.best_mjd - near.night) - np.median(far.best_mjd - far.night)
    assert apart == pytest.approx(220.0 / 360.0, abs=0.05)
    usable = sky_of_trial(setting_of(two_sites), 0)
    assert not np.array_equal(usable["Far"], usable["Small"])


def test_joined_telescopes_agree_after_the_fit(two_sites, forecast):
    """Their own scales differ by up to a tenth; joined, both follow one light curve."""
    lively = replace(forecast, amplitude_mag=0.4, timescale_obs_d=60.0)
    prospect = prospect_for(two_sites, lively)
    setting = setting_of(two_sites)
    placing = place_in(prospect, Layout(3, 1, 120, 1))
    apart, together = [], []
    for trial in range(12):
        draw = draw_trial(setting, prospect, trial)
        used = nights_used(prospect, Layout(3, 1, 120, 1), placing, draw.usable)
        curves = observe(prospect, draw, used)
        mine = [n.best_mjd[u] for n, u in zip(prospect.continuum, used[0], strict=True)]
        assert curves.t_continuum.size == sum(t.size for t in mine)
        assert (np.diff(curves.t_continuum) >= 0).all()
        raw = [m.flux[u] for m, u in zip(draw.continuum, used[0], strict=True)]
        expected = np.interp(mine[1], mine[0], raw[0])
        apart.append(np.mean(raw[1] - expected))
        at = np.isin(curves.t_continuum, mine[1])
        together.append(np.mean(curves.f_continuum[at] - expected))
    assert np.std(together) < 0.3 * np.std(apart)


@pytest.mark.parametrize(
    ("time", "most"), [({"nights": 12}, 12), ({"hours": 6.0}, 9), ({"hours": 6.0,
     "least_hours_per_night": 2.0}, 3), ({}, 10**6)],
)  # fmt: skip
def test_the_time_granted_ends_a_layout(campaign, forecast, time, most):
    """A visit takes 1620 s with slew and read-out, and 780 s more of standard stars."""
    telescopes = tuple(replace(t, time=TimeAllotment(**time)) for t in campaign.telescopes)
    campaign = replace(with_line(campaign, standards_s=780.0), telescopes=telescopes)
    prospect = prospect_for(campaign, forecast)
    assert prospect.line[0].visit_s == 1620.0
    assert prospect.line[0].most_visits == most
    layout = Layout(2, 1, 120, 1)
    usable = dict.fromkeys(("Big", "Small"), np.ones(181, dtype=bool))
    _, (line,) = nights_used(prospect, layout, place_in(prospect, layout), usable)
    assert line.sum() <= most
    assert line.sum() > 30 or line.sum() == most


def test_technical_trouble_takes_its_share_of_nights(campaign):
    shares = []
    for loss in (0.0, 0.3):
        telescopes = tuple(replace(t, technical_loss=loss) for t in campaign.telescopes)
        setting = setting_of(replace(campaign, telescopes=telescopes))
        shares.append(np.mean([sky_of_trial(setting, i)["Big"].mean() for i in range(200)]))
    assert shares[1] / shares[0] == pytest.approx(0.7, abs=0.02)


def test_the_continuum_of_spectra_comes_with_them(campaign, forecast):
    spectra = replace(campaign.continuum, feeds=(), in_spectra=True)
    prospect = prospect_for(replace(campaign, continuum=spectra), forecast)
    (line,), (ridden,) = prospect.line, prospect.continuum
    assert ridden.in_spectra_of == 0
    assert ridden.visit_s == 0
    assert np.array_equal(ridden.night, line.night)
    assert (ridden.flux_error < line.flux_error).all()
    assert (ridden.flux_error >= line.scale_error).all()


def test_forecasts_know_the_band_of_the_images(campaign):
    target = campaign.targets[0]
    common = {"relations": {}, "cosmology": campaign.cosmology, "error_below": 0.3}
    blue, red = (forecast_of(target, band=band, **common) for band in ("B", "R"))
    assert blue.amplitude_mag > red.amplitude_mag
