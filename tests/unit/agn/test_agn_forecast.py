import math
from dataclasses import replace

import pytest

from planner.agn import (
    RELATIONS,
    agn_log_luminosity,
    damped_random_walk,
    forecast,
    lag_rest,
    log_mass,
)
from planner.agn.variability import absolute_i_mag
from planner.base.errors import InputError
from planner.model.campaign import Cosmology
from planner.model.target import Magnitude, Target

COSMOLOGY = Cosmology()
SEYFERT = Target(
    "Seyfert", 10.0, 20.0, 0.05, magnitude=Magnitude("g", 16.0), host_fraction=0.4, ebv_mag=0.05
)


def expect(target, band="g", relations=None, error_below=0.3):
    return forecast(
        target,
        band=band,
        relations=relations or {},
        cosmology=COSMOLOGY,
        error_below=error_below,
    )


def test_lag_comes_from_the_relation_and_is_stretched_to_the_observer():
    f = expect(SEYFERT)
    log_lum = agn_log_luminosity(SEYFERT, 5100, COSMOLOGY)
    assert (f.line, f.relation, f.luminosity_wavelength_a) == ("Hbeta", "bentz2013", 5100)
    assert f.log_luminosity == log_lum
    assert f.lag_rest_d == lag_rest(RELATIONS["Hbeta"]["bentz2013"], log_lum)
    assert f.lag_obs_d == pytest.approx(1.05 * f.lag_rest_d)
    assert f.agn_fraction == 0.6
    assert not f.outside_range


def test_scatter_is_that_of_a_new_agn_with_the_luminositys_error():
    distance = 2 / math.log(10) * 300 / (299792.458 * 0.05)
    assert expect(SEYFERT).lag_scatter_dex == pytest.approx(
        math.sqrt(0.23**2 + 0.533**2 * (0.1**2 + distance**2)), abs=1e-9
    )
    # a relation with more scatter of its own keeps it
    wide = replace(SEYFERT, line="Halpha")
    assert expect(wide).lag_scatter_dex > 0.31


def test_chosen_relation_is_used_for_its_line_only():
    f = expect(SEYFERT, relations={"Hbeta": "dallabonta2020", "MgII": "khadka2021"})
    assert f.relation == "dallabonta2020"
    far = replace(SEYFERT, redshift=1.2, host_fraction=None)
    assert expect(far, relations={"Hbeta": "dallabonta2020"}).relation == "zajacek2021"


def test_known_iron_strength_chooses_the_relation_that_uses_it():
    strong = expect(replace(SEYFERT, iron_strength=1.5))
    weak = expect(replace(SEYFERT, iron_strength=0.1))
    assert strong.relation == weak.relation == "duwang2019"
    assert strong.lag_rest_d / weak.lag_rest_d == pytest.approx(10 ** (-0.35 * 1.4))
    chosen = expect(replace(SEYFERT, iron_strength=1.5), relations={"Hbeta": "bentz2013"})
    assert chosen.lag_rest_d == expect(SEYFERT).lag_rest_d


def test_relation_with_iron_but_no_iron_strength_is_refused():
    with pytest.raises(InputError, match="target Seyfert: the relation duwang2019 needs its iron"):
        expect(SEYFERT, relations={"Hbeta": "duwang2019"})


def test_unknown_relation_is_refused_and_an_empty_key_means_the_default():
    with pytest.raises(InputError, match="no relation kaspi2021 for Hbeta; choose among bentz2013"):
        expect(SEYFERT, relations={"Hbeta": "kaspi2021"})
    assert expect(SEYFERT, relations={"Hbeta": ""}) == expect(SEYFERT)


@pytest.mark.parametrize(
    ("redshift", "line", "wavelength_a"), [(1.5, "MgII", 3000), (2.5, "CIV", 1350)]
)
def test_distant_quasars_get_their_ultraviolet_lines(redshift, line, wavelength_a):
    quasar = Target("quasar", 10.0, 20.0, redshift, magnitude=Magnitude("i", 18.5))
    f = expect(quasar)
    assert (f.line, f.luminosity_wavelength_a) == (line, wavelength_a)
    assert f.agn_fraction == 1.0
    assert 20 < f.lag_rest_d < 400


def test_given_values_are_taken_at_their_word():
    f = expect(
        replace(
            SEYFERT,
            lag_rest_d=20.0,
            amplitude_mag=0.15,
            timescale_rest_d=100.0,
            log_mass=7.5,
            line_width_km_s=2500.0,
            line_equivalent_width_a=60.0,
        )
    )
    assert (f.relation, f.lag_rest_d, f.lag_scatter_dex) == ("given", 20.0, 0.1)
    assert (f.amplitude_mag, f.amplitude_scatter_dex) == (0.15, 0.0)
    assert f.timescale_obs_d == pytest.approx(105.0)
    assert f.timescale_scatter_dex == 0.0
    assert (f.log_mass, f.line_width_km_s, f.line_equivalent_width_a) == (7.5, 2500.0, 60.0)


def test_defaults_of_the_line_and_its_mass():
    f = expect(SEYFERT)
    assert f.line_width_km_s == 4000.0
    assert f.line_equivalent_width_a == pytest.approx(80 * 0.6)  # diluted by the host
    assert f.log_mass == pytest.approx(log_mass(f.lag_rest_d, 4000.0))
    assert f.mass_dex < expect(SEYFERT, error_below=0.5).mass_dex


def test_bluer_light_varies_more():
    assert expect(SEYFERT, band="u").amplitude_mag > expect(SEYFERT, band="i").amplitude_mag


def test_heavier_black_hole_varies_more_and_slower():
    light, heavy = (expect(replace(SEYFERT, log_mass=m)) for m in (7.0, 9.0))
    assert heavy.amplitude_mag > light.amplitude_mag
    assert heavy.timescale_obs_d > light.timescale_obs_d


def test_luminosity_outside_the_calibration_is_flagged():
    known = replace(SEYFERT, magnitude=None, log_luminosity=(5100, 41.0))
    assert expect(known).outside_range
    assert not expect(replace(known, log_luminosity=(5100, 43.0))).outside_range
    assert expect(replace(known, log_luminosity=(5100, 47.0))).outside_range


def test_variability_is_that_of_the_rest_wavelength_behind_the_band():
    far = replace(SEYFERT, redshift=0.5, log_mass=8.5)
    f = expect(far, band="r")
    amplitude_mag, timescale_rest_d = damped_random_walk(
        6176 / 1.5, absolute_i_mag(f.log_luminosity, 5100), 8.5
    )
    assert f.amplitude_mag == pytest.approx(amplitude_mag)
    assert f.timescale_obs_d == pytest.approx(1.5 * timescale_rest_d)
