"""Electrons of each instrument, counted a second time by hand or by drawing photons."""

from dataclasses import replace

import numpy as np
import pytest

from planner.model.observatory import Camera, KnownCase, Spectrograph, Telescope, TimeAllotment
from planner.telescope.conditions import Conditions, fwhm_arcsec
from planner.telescope.imaging import camera_rates
from planner.telescope.known_case import known_rates
from planner.telescope.rates import ab_photons_s_a, variance_e2
from planner.telescope.refraction import differential_refraction_arcsec
from planner.telescope.spectra import extracted, spectrograph_rates

TELESCOPE = Telescope("C10", "ridge", 1.0, 0.3, 60.0, 30.0, 0.0, TimeAllotment())
CAMERA = Camera("V", 0.4, 0.5, 8.0, 0.05, 1.0, None, 0)
SLIT = Spectrograph(0.25, 1.5, 6.0, 2.0, False, None, 5100.0, 0.3, 4.0, 0.002)
FIBRE = replace(SLIT, fibre=True, slit_arcsec=2.5)
CASE = KnownCase(100.0, "V", 16.0, 300.0, 1.2, 0.2, 0.05)
CONDITIONS = Conditions(1.5, 21.0, 0.15, 1.2, 30.0, 21.5)


def test_seeing_grows_with_airmass_and_falls_with_wavelength():
    # 1.5^0.6 = 1.275 and 2^0.6 = 1.516
    assert fwhm_arcsec(CONDITIONS, 5000.0) == pytest.approx(1.2 * 1.275, rel=1e-3)
    assert fwhm_arcsec(CONDITIONS._replace(airmass=2.0), 5000.0) == pytest.approx(
        1.2 * 1.516, rel=1e-3
    )
    assert fwhm_arcsec(CONDITIONS._replace(airmass=1.0), 8000.0) == pytest.approx(1.0923, rel=1e-3)


def test_camera_counted_by_hand():
    rates = camera_rates(CAMERA, TELESCOPE, 17.0, CONDITIONS)
    mirror_cm2 = 3.14159265 * 2500.0 * (1 - 0.09)
    per_a = 5.480e6 / 5478.0 * mirror_cm2  # photons of magnitude 0
    radius = 1.2 * 1.5**0.6 * (5478 / 5000) ** -0.2
    area = 3.14159265 * radius**2
    detected = 0.4 * 893.0
    assert rates.source_e_s == pytest.approx(
        per_a * detected * 10 ** (-0.4 * (17.0 + 0.02 + 0.225)) * (1 - 2**-4), rel=1e-4
    )
    sky = per_a * detected * 10 ** (-0.4 * 21.0) * area
    assert rates.other_e_s == pytest.approx(sky + 0.05 * area / 0.25, rel=1e-4)
    assert rates.read_e2 == pytest.approx(64.0 * area / 0.25, rel=1e-6)


def test_slit_counted_by_hand():
    rates = spectrograph_rates(SLIT, TELESCOPE, 17.0, CONDITIONS, 5100.0)
    per_a = 5.480e6 / 5100.0 * 3.14159265 * 2500.0 * (1 - 0.09) * 0.25
    fwhm = 1.2 * 1.5**0.6 * (5100 / 5000) ** -0.2
    sigma = fwhm / 2.35482
    rng = np.random.default_rng(5)
    x, y = rng.normal(0.0, sigma, (2, 400_000))
    share = np.mean((abs(x) < 1.0) & (abs(y) < fwhm))
    assert rates.source_e_s == pytest.approx(
        per_a * 10 ** (-0.4 * 17.225) * share, rel=4 / 400_000**0.5
    )
    pixels = 2 * fwhm / 0.3 / 1.5
    assert rates.other_e_s == pytest.approx(
        per_a * 10 ** (-0.4 * 21.0) * 2.0 * 2 * fwhm + 0.002 * pixels, rel=1e-4
    )
    assert rates.read_e2 == pytest.approx(16.0 * pixels, rel=1e-6)


def test_fibre_takes_its_whole_area_and_image():
    rates = spectrograph_rates(FIBRE, TELESCOPE, 17.0, CONDITIONS, 5100.0)
    sky = 0.25 * ab_photons_s_a(TELESCOPE, 21.0, 5100.0) * 3.14159265 * 1.25**2
    pixels = 2.5 / 0.3 / 1.5
    assert rates.other_e_s == pytest.approx(sky + 0.002 * pixels, rel=1e-6)
    assert rates.read_e2 == pytest.approx(16.0 * pixels, rel=1e-9)


@pytest.mark.parametrize("wavelength_a", [3700.0, 5100.0, 8500.0])
@pytest.mark.parametrize("spectrograph", [replace(SLIT, slit_angle_deg=75.0), FIBRE])
def test_light_lost_beside_slit_and_fibre(spectrograph, wavelength_a):
    """Photons drawn about the refracted image, which lies along the vertical circle."""
    conditions = CONDITIONS._replace(airmass=1.9)
    rng = np.random.default_rng(6)
    fwhm = fwhm_arcsec(conditions, wavelength_a)
    north, east = rng.normal(0.0, fwhm / 2.35482, (2, 400_000))
    shift = differential_refraction_arcsec(wavelength_a, 5100.0, 1.9)
    north += shift * np.cos(np.radians(30.0))
    east += shift * np.sin(np.radians(30.0))
    if spectrograph.fibre:
        share = np.mean(np.hypot(north, east) < 1.25)
    else:
        # across a slit at 75 degrees; the extraction follows the spectrum along the slit
        across = east * np.cos(np.radians(75.0)) - north * np.sin(np.radians(75.0))
        share = np.mean(abs(across) < 1.0) * 0.98146
    assert extracted(spectrograph, conditions, wavelength_a) == pytest.approx(
        share, abs=4 * 0.5 / 400_000**0.5
    )


def test_slit_along_the_parallactic_angle_loses_nothing_to_refraction():
    kept = extracted(SLIT, CONDITIONS, 3700.0)
    fixed = replace(SLIT, slit_angle_deg=30.0)
    assert extracted(fixed, CONDITIONS, 3700.0) == pytest.approx(kept, rel=1e-12)
    # the other way round is the same slit
    turned = replace(SLIT, slit_angle_deg=210.0)
    assert extracted(turned, CONDITIONS, 3700.0) == pytest.approx(kept, rel=1e-12)
    across = replace(SLIT, slit_angle_deg=120.0)
    assert extracted(across, CONDITIONS, 3700.0) < 0.8 * kept
    angles = np.array([30.0, 75.0, 120.0])
    many = extracted(fixed, CONDITIONS._replace(parallactic_deg=angles), 3700.0)
    assert many.shape == (3,)
    assert np.all(np.diff(many) < 0)


def test_known_case_gives_back_its_case():
    there = CONDITIONS._replace(airmass=1.2, sky_ab_mag=21.5)
    for wavelength_a in (None, 5100.0):
        for share in (0.0, 0.2, 0.9, None):
            case = replace(CASE, sky_share=share)
            rates = known_rates(case, 16.0, there, wavelength_a)
            variance = variance_e2(rates, 300.0, 1)
            assert rates.source_e_s * 300.0 / variance**0.5 == pytest.approx(100.0, rel=1e-12)
            assert rates.read_e2 / variance == pytest.approx(0.05, rel=1e-12)
            if share is not None:
                assert rates.other_e_s * 300.0 / variance == pytest.approx(share, abs=1e-12)


def test_known_case_scales_each_part_by_its_own_law():
    base = known_rates(CASE, 16.0, CONDITIONS._replace(airmass=1.2), None)
    fainter = known_rates(CASE, 17.0, CONDITIONS._replace(airmass=2.2), None)
    assert fainter.source_e_s / base.source_e_s == pytest.approx(10 ** (-0.4 * 1.15), rel=1e-12)
    blur = (2.2 / 1.2) ** 0.6
    assert fainter.other_e_s / base.other_e_s == pytest.approx(blur**2, rel=1e-12)
    assert fainter.read_e2 == base.read_e2
    slit = known_rates(CASE, 16.0, CONDITIONS._replace(airmass=2.2, sky_ab_mag=18.5), 5100.0)
    assert slit.other_e_s / base.other_e_s == pytest.approx(blur * 10.0, rel=1e-12)


def test_estimated_sky_share_is_that_of_the_usual_aperture():
    there = CONDITIONS._replace(airmass=1.2, sky_ab_mag=21.5)
    quiet = replace(CAMERA, read_noise_e=0.0, dark_e_s=0.0)
    camera = camera_rates(quiet, TELESCOPE, 18.0, there)
    case = replace(CASE, magnitude_mag=18.0, sky_share=None, read_share=0.0)
    known = known_rates(case, 18.0, there, None)
    assert known.other_e_s / known.source_e_s == pytest.approx(
        camera.other_e_s / camera.source_e_s, rel=0.01
    )
    fwhm = fwhm_arcsec(there, 5100.0)
    quiet = replace(SLIT, slit_arcsec=fwhm, read_noise_e=0.0, dark_e_s=0.0)
    slit = spectrograph_rates(quiet, TELESCOPE, 18.02, there, 5100.0)
    known = known_rates(case, 18.0, there, 5100.0)
    assert known.other_e_s / known.source_e_s == pytest.approx(
        slit.other_e_s / slit.source_e_s, rel=0.01
    )
