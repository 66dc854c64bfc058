"""What holds for every instrument, target and sky."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.model.observatory import (
    Camera,
    Feed,
    KnownCase,
    LineMeasurement,
    SkyQuality,
    Spectrograph,
    Telescope,
    TimeAllotment,
)
from planner.sky import extinction_at, sky_ab_mag
from planner.telescope import (
    Conditions,
    exposure_for,
    image_error,
    line_error,
    signal_to_noise,
)
from planner.telescope.imaging import camera_rates
from planner.telescope.rates import variance_e2
from planner.telescope.spectra import spectrograph_rates

WAVELENGTH_A = 5300.0
TELESCOPE = Telescope("C", "ridge", 1.0, 0.3, 60.0, 30.0, 0.0, TimeAllotment())
QUALITY = SkyQuality(1.2, (("g", 22.2), ("r", 21.2)), (("g", 0.18), ("r", 0.1)))
SHARP = 1 - 1e-9

telescopes = st.builds(
    lambda size, hole: replace(TELESCOPE, aperture_m=size, obstruction=hole),
    st.floats(0.2, 10),
    st.floats(0, 0.8),
)
cameras = st.builds(
    Camera,
    band=st.sampled_from("ugrizBVR"),
    throughput=st.floats(0.05, 0.9),
    pixel_arcsec=st.floats(0.1, 2),
    read_noise_e=st.floats(0, 30),
    dark_e_s=st.floats(0, 2),
    aperture_fwhm=st.floats(0.5, 3),
    comparison_mag=st.none() | st.floats(9, 18),
    comparison_stars=st.integers(1, 20),
)
# guided at the line and along the parallactic angle: with the image beside the slit a worse
# seeing can bring light in
spectrographs = st.builds(
    Spectrograph,
    throughput=st.floats(0.02, 0.6),
    dispersion_a=st.floats(0.2, 5),
    resolution_a=st.floats(0.5, 20),
    slit_arcsec=st.floats(0.5, 8),
    fibre=st.booleans(),
    slit_angle_deg=st.none(),
    guide_a=st.just(WAVELENGTH_A),
    pixel_arcsec=st.floats(0.1, 1),
    read_noise_e=st.floats(0, 20),
    dark_e_s=st.floats(0, 0.1),
)
cases = st.builds(
    KnownCase,
    signal_to_noise=st.floats(5, 500),
    band=st.sampled_from("gVr"),
    magnitude_mag=st.floats(12, 21),
    exposure_s=st.floats(10, 3600),
    airmass=st.floats(1, 2),
    sky_share=st.none() | st.floats(0, 0.6),
    read_share=st.floats(0, 0.35),
)
conditions_of = st.builds(
    Conditions,
    airmass=st.floats(1, 3),
    sky_ab_mag=st.floats(17, 22.5),
    extinction_mag=st.floats(0.02, 0.8),
    seeing_arcsec=st.floats(0.5, 4),
    parallactic_deg=st.floats(-180, 180),
    known_sky_ab_mag=st.floats(20, 22.5),
)
magnitudes = st.floats(12, 22)
exposures = st.floats(10, 7200)
measurements = st.builds(
    LineMeasurement, st.none() | st.floats(20, 300), st.none() | st.floats(5, 80)
)


def feed(instrument, floor=0.0, count=1):
    return Feed("C", instrument, floor, None, 0.02, 3600.0, count, 20.0, 100.0, 0.0, 1.0)


def error(made, telescope, magnitude, exposure_s, conditions, measurement):
    """Flux error of a camera's image or of a spectrum's line."""
    if isinstance(made.instrument, Camera):
        return image_error(made, telescope, magnitude, exposure_s, conditions)
    return line_error(
        made, telescope, measurement, magnitude, exposure_s, conditions,
        60.0, 4000.0, WAVELENGTH_A, 0.05,
    )  # fmt: skip


setups = st.builds(
    lambda instrument, floor, count, *rest: (feed(instrument, floor, count), *rest),
    cameras | spectrographs | cases,
    st.floats(0, 0.05),
    st.integers(1, 5),
    telescopes,
    magnitudes,
    exposures,
    conditions_of,
    measurements,
)


@given(setups)
def test_never_under_the_floor(setup):
    found = error(*setup)
    assert np.isfinite(found)
    assert found > setup[0].floor or found == pytest.approx(setup[0].floor, rel=1e-9)


@given(setups, st.floats(0.01, 4))
def test_grows_with_magnitude(setup, fainter):
    made, telescope, magnitude, exposure_s, conditions, measurement = setup
    made = replace(made, floor=0.0)
    bright = error(made, telescope, magnitude, exposure_s, conditions, measurement)
    faint = error(made, telescope, magnitude + fainter, exposure_s, conditions, measurement)
    # comparison stars may have all the noise of a bright target
    assert faint >= bright * SHARP


@given(setups, st.floats(1.01, 20))
def test_falls_with_exposure_between_its_root_and_itself(setup, factor):
    made, telescope, magnitude, exposure_s, conditions, measurement = setup
    made = replace(made, floor=0.0)
    short = error(made, telescope, magnitude, exposure_s, conditions, measurement)
    long = error(made, telescope, magnitude, exposure_s * factor, conditions, measurement)
    assert short / factor * SHARP <= long <= short / factor**0.5 / SHARP


@given(setups, st.floats(0.01, 3), st.floats(0, 3), st.floats(0, 2))
def test_never_falls_with_airmass_brighter_sky_or_seeing(setup, more_sky, more_air, more_seeing):
    made, telescope, magnitude, exposure_s, conditions, measurement = setup
    if isinstance(made.instrument, KnownCase):
        # its estimate of the sky's share knows the seeing, which stands for its own case's
        more_seeing = 0.0
    before = error(made, telescope, magnitude, exposure_s, conditions, measurement)
    for worse in (
        conditions._replace(sky_ab_mag=conditions.sky_ab_mag - more_sky),
        conditions._replace(airmass=conditions.airmass + more_air),
        conditions._replace(seeing_arcsec=conditions.seeing_arcsec + more_seeing),
    ):
        after = error(made, telescope, magnitude, exposure_s, worse, measurement)
        assert after >= before * SHARP


@given(setups, st.floats(5, 80), st.floats(0, 0.9), st.floats(20, 120), st.floats(0.02, 0.1))
def test_never_falls_with_the_moon(setup, moon_altitude, lit, separation, fuller):
    made, telescope, magnitude, exposure_s, conditions, measurement = setup

    def under(altitude_deg, illumination):
        sky = sky_ab_mag(QUALITY, WAVELENGTH_A, 50.0, altitude_deg, illumination, separation)
        here = conditions._replace(
            sky_ab_mag=float(sky), extinction_mag=extinction_at(QUALITY, WAVELENGTH_A)
        )
        return error(made, telescope, magnitude, exposure_s, here, measurement)

    moonless, moon, fuller_moon = under(-5.0, lit), under(moon_altitude, lit), under(
        moon_altitude, lit + fuller
    )  # fmt: skip
    assert moonless <= moon / SHARP
    assert moon <= fuller_moon / SHARP


def noise_limits(instrument):
    """The same instrument limited by photons, sky and read-out, with magnitudes that do it."""
    quiet = replace(instrument, read_noise_e=0.0, dark_e_s=0.0)
    loud = replace(instrument, read_noise_e=3e5, dark_e_s=0.0)
    return {"photons": (quiet, 2.0), "sky": (quiet, 34.0), "read-out": (loud, 18.0)}


def ratio_of(instrument, limit, exposure_s, size=1.0):
    made, magnitude = noise_limits(instrument)[limit]
    telescope = replace(TELESCOPE, aperture_m=size)
    conditions = Conditions(1.2, 21.0, 0.15, 1.2, 0.0, 21.5)
    return signal_to_noise(feed(made), telescope, magnitude, exposure_s, conditions, WAVELENGTH_A)


@given(cameras | spectrographs, st.floats(10, 1000), st.floats(1.1, 10))
def test_limits_of_the_noise(instrument, exposure_s, factor):
    """Signal-to-noise over time and mirror: roots with photons or sky, straight with read-out."""
    for limit, power in {"photons": 0.5, "sky": 0.5, "read-out": 1.0}.items():
        base = ratio_of(instrument, limit, exposure_s)
        longer = ratio_of(instrument, limit, exposure_s * factor)
        assert longer / base == pytest.approx(factor**power, rel=0.01)
        # twice the diameter is four times the light
        wider = ratio_of(instrument, limit, exposure_s, size=2.0)
        assert wider / base == pytest.approx(4.0**power, rel=0.01)


@given(setups, st.floats(0.003, 0.3))
def test_exposure_found_is_the_shortest(setup, wanted):
    made, telescope, magnitude, _, conditions, measurement = setup

    def error_of(exposure_s):
        return float(error(made, telescope, magnitude, exposure_s, conditions, measurement))

    exposure_s, reached = exposure_for(error_of, wanted, 30.0, 3605.0)
    assert 30.0 <= exposure_s <= 3605.0
    assert reached == (error_of(exposure_s) <= wanted)
    if not reached:
        assert exposure_s == 3605.0
    elif exposure_s > 30.0:
        assert error_of(10.0 * (np.ceil(exposure_s / 10.0) - 1.0)) > wanted


REFERENCE = Conditions(1.2, 21.6, 0.15, 1.1, 20.0, 21.6)
FULL = {
    "small camera": (0.5, Camera("V", 0.35, 0.8, 10.0, 0.05, 1.0, None, 0), 17.5, 120.0),
    "slit": (
        2.0, Spectrograph(0.2, 2.0, 8.0, 2.0, False, None, 5300.0, 0.4, 5.0, 0.002), 18.0, 900.0,
    ),
    "fibre": (
        4.0, Spectrograph(0.12, 1.0, 3.0, 2.5, True, None, 5300.0, 0.4, 3.0, 0.001), 18.5, 1200.0,
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", FULL)
@pytest.mark.parametrize("airmass", [1.0, 1.2, 1.7])
@pytest.mark.parametrize("moonlight_mag", [0.0, 1.5])
def test_known_case_follows_the_full_model(name, airmass, moonlight_mag):
    """One number of the full model, taken as known, gives its errors within 15 per cent."""
    size, instrument, magnitude, exposure_s = FULL[name]
    telescope = replace(TELESCOPE, aperture_m=size)
    if isinstance(instrument, Camera):
        rates = camera_rates(instrument, telescope, magnitude, REFERENCE)
        band, measurement = "V", None
    else:
        rates = spectrograph_rates(instrument, telescope, magnitude, REFERENCE, WAVELENGTH_A)
        band, measurement = "g", LineMeasurement(100.0, None)
    variance = variance_e2(rates, exposure_s, 1)
    known = KnownCase(
        rates.source_e_s * exposure_s / variance**0.5,
        band,
        magnitude,
        exposure_s,
        REFERENCE.airmass,
        rates.other_e_s * exposure_s / variance,
        rates.read_e2 / variance,
    )
    here = REFERENCE._replace(airmass=airmass, sky_ab_mag=REFERENCE.sky_ab_mag - moonlight_mag)
    for brighter in np.linspace(-1.5, 1.5, 7):
        for longer in np.geomspace(20**-0.5, 20**0.5, 5):
            numbers = (magnitude - brighter, exposure_s * longer, here)
            if measurement is None:
                full = image_error(feed(instrument), telescope, *numbers)
                ours = image_error(feed(known), telescope, *numbers)
            else:
                rest = (*numbers, 60.0, 4000.0, WAVELENGTH_A, 0.05)
                full = line_error(feed(instrument), telescope, measurement, *rest)
                ours = line_error(feed(known), telescope, measurement, *rest)
            assert ours == pytest.approx(full, rel=0.15)
