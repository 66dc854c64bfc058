from dataclasses import replace

import numpy as np
import pytest

from planner.model.observatory import (
    Camera,
    Feed,
    KnownCase,
    LineMeasurement,
    Spectrograph,
    Telescope,
    TimeAllotment,
)
from planner.telescope import (
    Conditions,
    exposure_for,
    image_error,
    line_error,
    signal_to_noise,
    spectral_continuum_error,
    visit_s,
)

TELESCOPE = Telescope("C10", "ridge", 1.0, 0.3, 60.0, 30.0, 0.0, TimeAllotment())
CAMERA = Camera("V", 0.4, 0.5, 8.0, 0.05, 1.0, None, 0)
SLIT = Spectrograph(0.25, 1.5, 6.0, 2.0, False, None, 5100.0, 0.3, 4.0, 0.002)
CASE = KnownCase(80.0, "V", 16.0, 300.0, 1.2, 0.2, 0.0)
DARK = Conditions(1.2, 21.5, 0.15, 1.2, 30.0, 21.5)
PLAIN = LineMeasurement(None, None)
LINE = {
    "equivalent_width_obs_a": 50.0,
    "line_width_km_s": 4000.0,
    "wavelength_obs_a": 5000.0,
    "redshift": 0.03,
}


def feed(instrument, **changes):
    made = Feed("C10", instrument, 0.0, None, 0.02, 3600.0, 1, 20.0, 100.0, 0.0, 1.0)
    return replace(made, **changes)


def known_line(measurement=PLAIN, **changes):
    """Line error of the known case, where S = 6400 / 0.8 = 8000 and v = 10000 per angstrom."""
    return float(
        line_error(feed(CASE), TELESCOPE, measurement, 16.0, 300.0, DARK, **{**LINE, **changes})
    )


def test_error_is_one_over_the_signal_to_noise_and_the_floor_adds_in_quadrature():
    for instrument in (CAMERA, CASE):
        ratio = signal_to_noise(feed(instrument), TELESCOPE, 16.0, 200.0, DARK, None)
        bare = image_error(feed(instrument), TELESCOPE, 16.0, 200.0, DARK)
        assert bare == pytest.approx(1 / ratio, rel=1e-12)
        floored = image_error(feed(instrument, floor=0.01), TELESCOPE, 16.0, 200.0, DARK)
        assert floored == pytest.approx(np.hypot(bare, 0.01), rel=1e-12)


def test_comparison_stars_add_their_own_noise():
    with_stars = replace(CAMERA, comparison_mag=16.0, comparison_stars=4)
    bare = image_error(feed(CAMERA), TELESCOPE, 16.0, 200.0, DARK)
    # four stars as bright as the target: variance times 1 + 1/4
    assert image_error(feed(with_stars), TELESCOPE, 16.0, 200.0, DARK) == pytest.approx(
        bare * 1.25**0.5, rel=1e-12
    )


def test_each_frame_is_read_once():
    noisy = replace(CAMERA, read_noise_e=1e5, dark_e_s=0.0)
    one = image_error(feed(noisy), TELESCOPE, 16.0, 200.0, DARK)
    four = image_error(feed(noisy, exposures=4), TELESCOPE, 16.0, 200.0, DARK)
    assert four / one == pytest.approx(2.0, rel=1e-3)


def test_line_counted_photon_by_photon():
    # D = 2.5 x 4000 / 299792.458 x 5000 = 166.782 angstrom, line = 50 x 8000 electrons
    assert known_line() == pytest.approx((4e5 + 2 * 166.782 * 1e4) ** 0.5 / 4e5, rel=1e-6)
    # continuum from 80 angstrom in the rest frame, 82.4 observed: + D^2 / 82.4
    windows = 166.782 + 166.782**2 / 82.4
    assert known_line(LineMeasurement(80.0, None)) == pytest.approx(
        (4e5 + windows * 1e4) ** 0.5 / 4e5, rel=1e-6
    )


def test_narrow_lines_that_scale_the_spectra_add_their_error():
    # 20 angstrom at rest, 20.6 observed, in a window of 2.5 x 400 / 299792.458 x 5000 = 16.6782
    narrow = (20.6 * 8e3 + 2 * 16.6782 * 1e4) ** 0.5 / (20.6 * 8e3)
    assert known_line(LineMeasurement(None, 20.0)) == pytest.approx(
        np.hypot(known_line(), narrow), rel=1e-6
    )


def test_poor_resolution_widens_the_windows():
    arguments = (TELESCOPE, PLAIN, 16.0, 900.0, DARK)
    sharp = line_error(feed(replace(SLIT, resolution_a=0.0)), *arguments, **LINE)
    blurred = line_error(feed(replace(SLIT, resolution_a=66.713)), *arguments, **LINE)
    wider = line_error(
        feed(replace(SLIT, resolution_a=0.0)),
        *arguments,
        **{**LINE, "line_width_km_s": 4000.0 * 2**0.5},
    )
    assert blurred == pytest.approx(wider, rel=1e-5)
    assert blurred > 1.1 * sharp


def test_spectral_continuum_is_averaged_over_its_window_without_the_floor():
    arguments = (TELESCOPE, 16.0, 900.0, DARK, 5000.0)
    per_pixel = signal_to_noise(feed(SLIT), *arguments)
    error = spectral_continuum_error(feed(SLIT, floor=0.05), *arguments, 60.0)
    assert error == pytest.approx(1 / (per_pixel * 40.0**0.5), rel=1e-12)
    per_a = signal_to_noise(feed(CASE), TELESCOPE, 16.0, 300.0, DARK, 5000.0)
    assert per_a == pytest.approx(80.0, rel=1e-12)


def test_conditions_broadcast():
    conditions = Conditions(
        np.array([1.0, 1.4, 2.0]), np.array([[21.5], [19.0]]), 0.15, 1.2, 30.0, 21.5
    )
    for instrument in (CAMERA, CASE):
        table = image_error(feed(instrument), TELESCOPE, 16.0, 60.0, conditions)
        assert table.shape == (2, 3)
        one = Conditions(1.4, 19.0, 0.15, 1.2, 30.0, 21.5)
        assert table[1, 1] == image_error(feed(instrument), TELESCOPE, 16.0, 60.0, one)
    for instrument in (SLIT, replace(SLIT, fibre=True), replace(SLIT, slit_angle_deg=0.0), CASE):
        table = line_error(feed(instrument), TELESCOPE, PLAIN, 16.0, 60.0, conditions, **LINE)
        assert table.shape == (2, 3)


def test_a_spectrograph_takes_no_images():
    with pytest.raises(ValueError, match="images"):
        image_error(feed(SLIT), TELESCOPE, 16.0, 60.0, DARK)


def test_a_visit_costs_all_its_parts():
    # 60 slew + 30 acquisition + 100 overhead + 900 shutter + 3 x 20 read-out
    assert visit_s(feed(CAMERA, exposures=3), TELESCOPE, 900.0) == 1150.0


@pytest.mark.parametrize(
    ("wanted", "expected"),
    [
        (0.1, (100.0, True)),  # error 1 / sqrt(t): exactly 100 s
        (0.0999, (110.0, True)),
        (0.5, (30.0, True)),  # shorter than allowed: the shortest, in whole tens
        (995**-0.5, (995.0, True)),  # only the longest does
        (0.01, (995.0, False)),
    ],
)
def test_exposure_found_in_whole_ten_seconds(wanted, expected):
    assert exposure_for(lambda t: t**-0.5, wanted, 25.0, 995.0) == expected


def test_no_exposure_of_zero_is_tried():
    assert exposure_for(lambda t: 1 / t, 1.0, 0.0, 100.0) == (10.0, True)
    assert exposure_for(lambda t: 1 / t, 0.5, 4.0, 6.0) == (6.0, True)
