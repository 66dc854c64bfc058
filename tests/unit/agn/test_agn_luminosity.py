import math
from dataclasses import replace
from itertools import pairwise

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.agn import BANDS, agn_log_luminosity, host_fraction, magnitude_in
from planner.agn.luminosity import (
    absolute_ab_mag,
    apparent_ab_mag,
    at_wavelength,
    log_luminosity,
    luminosity_error_dex,
)
from planner.base.errors import InputError
from planner.model.campaign import Cosmology
from planner.model.target import Magnitude, Target

COSMOLOGY = Cosmology()
SEYFERT = Target("Seyfert", 10.0, 20.0, 0.03, magnitude=Magnitude("g", 15.5), ebv_mag=0.05)


@settings(deadline=None)
@given(
    log_lum=st.floats(41, 48),
    redshift=st.floats(0.002, 4),
    band=st.sampled_from(sorted(BANDS)),
    rest_a=st.sampled_from([1350, 3000, 5100]),
)
def test_luminosity_and_magnitude_are_inverse(log_lum, redshift, band, rest_a):
    pivot_a = BANDS[band].pivot_a
    ab_mag = apparent_ab_mag(log_lum, rest_a, redshift, pivot_a, COSMOLOGY)
    assert log_luminosity(ab_mag, pivot_a, redshift, rest_a, COSMOLOGY) == pytest.approx(
        log_lum, abs=1e-9
    )


def test_rest_wavelengths_are_joined_by_the_power_law():
    direct = log_luminosity(18.0, 4703.0, 0.7, 3000, COSMOLOGY)
    carried = at_wavelength(log_luminosity(18.0, 4703.0, 0.7, 5100, COSMOLOGY), 5100, 3000)
    assert direct == pytest.approx(carried, abs=1e-12)


def test_absolute_magnitude_of_a_source_of_known_luminosity():
    # 4 pi (10 pc)^2 x 3631 Jy x nu at 5100 angstrom = 8.42e34 erg/s is absolute magnitude 0
    flux = 3631e-23 * 2.99792458e18 / 5100
    area = 4 * 3.141592653589793 * (10 * 3.0856775814913673e18) ** 2
    log_lum_0 = math.log10(flux * area)
    assert absolute_ab_mag(log_lum_0 + 4, 5100, 5100) == pytest.approx(-10, abs=1e-3)


@pytest.mark.parametrize("band", BANDS)
def test_magnitude_in_its_own_band_is_the_one_given(band):
    target = replace(SEYFERT, magnitude=Magnitude(band, 16.3))
    assert magnitude_in(target, band, COSMOLOGY) == pytest.approx(16.3, abs=1e-12)


@pytest.mark.parametrize("host", [None, 0.0, 0.3])
@pytest.mark.parametrize("value_mag", [12.0, 14.0, 16.0, 20.0])
@pytest.mark.parametrize("band", ["g", "V"])
def test_a_target_known_by_luminosity_is_as_bright_as_one_known_by_magnitude(host, value_mag, band):
    seen = replace(SEYFERT, magnitude=Magnitude("r", value_mag), host_fraction=host)
    log_lum = agn_log_luminosity(seen, 3000, COSMOLOGY)
    known = replace(seen, magnitude=None, log_luminosity=(3000, log_lum))
    assert host_fraction(known, COSMOLOGY) == pytest.approx(
        host_fraction(seen, COSMOLOGY), abs=1e-9
    )
    assert magnitude_in(known, band, COSMOLOGY) == pytest.approx(
        magnitude_in(seen, band, COSMOLOGY), abs=1e-8
    )


def test_dust_makes_the_source_redder_and_its_true_luminosity_higher():
    clean = replace(SEYFERT, ebv_mag=0.0)
    dusty = replace(SEYFERT, ebv_mag=0.3, magnitude=Magnitude("g", 15.5))
    assert agn_log_luminosity(dusty, 5100, COSMOLOGY) > agn_log_luminosity(clean, 5100, COSMOLOGY)
    assert magnitude_in(dusty, "i", COSMOLOGY) < magnitude_in(clean, "i", COSMOLOGY)
    known = replace(clean, magnitude=None, log_luminosity=(5100, 43.5))
    assert magnitude_in(replace(known, ebv_mag=0.3), "g", COSMOLOGY) > magnitude_in(
        known, "g", COSMOLOGY
    )


def test_vega_bands_are_shifted_to_ab():
    # the same number in V (Vega) and a made-up AB reading differ by the offset of 0.02 mag
    target = replace(SEYFERT, ebv_mag=0.0, host_fraction=0.0, magnitude=Magnitude("V", 16.0))
    expected = log_luminosity(16.02, 5478.0, 0.03, 5100, COSMOLOGY)
    assert agn_log_luminosity(target, 5100, COSMOLOGY) == pytest.approx(expected, abs=1e-12)


def test_host_is_taken_off():
    bare = replace(SEYFERT, host_fraction=0.0)
    hosted = replace(SEYFERT, host_fraction=0.6)
    difference = agn_log_luminosity(bare, 5100, COSMOLOGY) - agn_log_luminosity(
        hosted, 5100, COSMOLOGY
    )
    assert difference == pytest.approx(0.39794, abs=1e-5)  # log10(1 / 0.4)


def test_default_host_fades_with_luminosity_and_never_jumps():
    shares = [
        host_fraction(replace(SEYFERT, magnitude=Magnitude("g", 18.0 - 0.02 * k)), COSMOLOGY)
        for k in range(400)
    ]
    assert shares[0] == 0.5
    assert shares[-1] == 0.0
    assert all(b <= a for a, b in pairwise(shares))
    assert max(a - b for a, b in pairwise(shares)) < 0.02


def test_luminosity_error_grows_where_less_is_known():
    far = replace(SEYFERT, redshift=0.3, host_fraction=0.2)
    near = replace(far, redshift=0.005)
    assert luminosity_error_dex(far, COSMOLOGY) == pytest.approx(0.1, abs=1e-3)
    assert luminosity_error_dex(near, COSMOLOGY) == pytest.approx(0.2004, abs=1e-3)
    assert luminosity_error_dex(SEYFERT, COSMOLOGY) > luminosity_error_dex(
        replace(SEYFERT, host_fraction=0.5), COSMOLOGY
    )
    known = replace(near, magnitude=None, log_luminosity=(5100, 42.0))
    assert luminosity_error_dex(known, COSMOLOGY) == 0.1


def test_a_target_without_brightness_is_refused():
    with pytest.raises(InputError, match=r"target Seyfert: give a magnitude or a log_luminosity"):
        agn_log_luminosity(replace(SEYFERT, magnitude=None), 5100, COSMOLOGY)
