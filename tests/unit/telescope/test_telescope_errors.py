from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.model.observatory import Instrument, Stream, Telescope, TimeAllotment
from planner.telescope import cost_h, flux_error, line_flux_error, visit_s

IMAGER = Instrument(
    signal_to_noise=100.0,
    reference_band="g",
    reference_mag=16.0,
    reference_s=120.0,
    reference_airmass=1.2,
    sky_share=0.2,
    floor=0.01,
    extinction_mag=0.15,
)
BARE = replace(IMAGER, floor=0.0)
LINE = {"equivalent_width_obs_a": 50.0, "line_width_km_s": 4000.0, "wavelength_obs_a": 5000.0}

instruments = st.builds(
    Instrument,
    signal_to_noise=st.floats(1, 1000),
    reference_band=st.just("g"),
    reference_mag=st.floats(10, 22),
    reference_s=st.floats(1, 3600),
    reference_airmass=st.floats(1, 2),
    sky_share=st.floats(0, 0.99),
    floor=st.floats(0, 0.1),
    extinction_mag=st.floats(0, 1),
)
magnitudes = st.floats(8, 26)
exposures = st.floats(0.1, 36000)
airmasses = st.floats(1, 4)


def both(instrument, magnitude_mag, exposure_s, airmass):
    """Errors of both streams for the same light."""
    return np.array(
        [
            flux_error(instrument, magnitude_mag, exposure_s, airmass),
            line_flux_error(instrument, magnitude_mag, exposure_s, airmass, **LINE),
        ]
    )


@pytest.mark.parametrize("share", [0.0, 0.2, 0.9])
def test_reference_gives_back_its_signal_to_noise(share):
    error = flux_error(replace(BARE, sky_share=share), 16.0, 120.0, 1.2)
    assert error == pytest.approx(0.01, rel=1e-12)


def test_airmass_may_be_an_array():
    airmass = np.array([1.0, 1.2, 1.8])
    errors = flux_error(IMAGER, 16.5, 60.0, airmass)
    assert errors.shape == (3,)
    assert errors.tolist() == [float(flux_error(IMAGER, 16.5, 60.0, x)) for x in airmass]
    assert line_flux_error(IMAGER, 16.5, 60.0, airmass, **LINE).shape == (3,)


def test_extinction_acts_like_a_change_of_magnitude():
    assert flux_error(BARE, 16.0, 120.0, 2.2) == pytest.approx(
        float(flux_error(BARE, 16.15, 120.0, 1.2)), rel=1e-12
    )


def test_photon_and_background_limits():
    photons, sky = replace(BARE, sky_share=0.0), replace(BARE, sky_share=0.999)
    one_mag = 10**0.4
    ratio = flux_error(photons, 17.0, 120.0, 1.2) / flux_error(photons, 16.0, 120.0, 1.2)
    assert ratio == pytest.approx(one_mag**0.5, rel=1e-12)
    ratio = flux_error(sky, 17.0, 120.0, 1.2) / flux_error(sky, 16.0, 120.0, 1.2)
    assert ratio == pytest.approx(one_mag, rel=1e-3)


def test_line_error_counted_photon_by_photon():
    # S = 8000, B = 2000 counts per angstrom for a signal-to-noise of 80 with a fifth from the sky:
    # D = 2.5 x 4000 / 299792.458 x 5000 = 166.78 angstrom, line = 50 x 8000 = 400000 counts,
    # variance = 400000 + 2 x 166.78 x 10000
    spectrograph = replace(BARE, signal_to_noise=80.0)
    expected = (400_000 + 2 * 166.7820 * 10_000) ** 0.5 / 400_000
    assert line_flux_error(spectrograph, 16.0, 120.0, 1.2, **LINE) == pytest.approx(
        expected, rel=1e-6
    )


def test_stronger_and_narrower_lines_are_measured_better():
    usual = line_flux_error(IMAGER, 17.0, 120.0, 1.2, **LINE)
    assert line_flux_error(IMAGER, 17.0, 120.0, 1.2, **{**LINE, "equivalent_width_obs_a": 90.0}) < (
        usual
    )
    assert line_flux_error(IMAGER, 17.0, 120.0, 1.2, **{**LINE, "line_width_km_s": 8000.0}) > usual


@given(instruments, magnitudes, exposures, airmasses, st.floats(1.01, 10))
def test_errors_fall_with_exposure_as_its_root_down_to_the_floor(
    instrument, magnitude_mag, exposure_s, airmass, factor
):
    bare = replace(instrument, floor=0.0)
    short = both(bare, magnitude_mag, exposure_s, airmass)
    long = both(bare, magnitude_mag, exposure_s * factor, airmass)
    np.testing.assert_allclose(long * factor**0.5, short, rtol=1e-9)
    assert np.all(both(instrument, magnitude_mag, exposure_s * factor, airmass) >= instrument.floor)


@given(instruments, magnitudes, exposures, airmasses, st.floats(0.01, 5))
def test_errors_grow_with_magnitude(instrument, magnitude_mag, exposure_s, airmass, fainter):
    bare = replace(instrument, floor=0.0)
    bright = both(bare, magnitude_mag, exposure_s, airmass)
    faint = both(bare, magnitude_mag + fainter, exposure_s, airmass)
    assert np.all(faint > bright)


@given(instruments, magnitudes, exposures, airmasses, st.floats(0.01, 2))
def test_errors_never_fall_with_airmass(instrument, magnitude_mag, exposure_s, airmass, more):
    high = both(instrument, magnitude_mag, exposure_s, airmass)
    low = both(instrument, magnitude_mag, exposure_s, airmass + more)
    assert np.all(low >= high * (1 - 1e-12))


def test_a_visit_costs_slew_exposure_and_overhead():
    stream = Stream("continuum", "C05", (1.0,), 300.0, 60.0, IMAGER)
    telescope = Telescope("C05", "ridge", 0.5, 120.0, TimeAllotment())
    assert visit_s(stream, telescope) == 480.0
    assert cost_h(15, stream, telescope) == pytest.approx(2.0)
