"""Photon rates and the signal-to-noise of a textbook."""

import pytest

from planner.base.bands import AB_ZERO_PHOTONS_S_CM2
from planner.model.observatory import Telescope, TimeAllotment
from planner.telescope.rates import Rates, ab_photons_s_a, variance_e2


def test_photons_of_magnitude_zero():
    # f_nu = 3631 Jy over Planck's constant: 5.480e6 photons/s/cm2 per unit of ln(wavelength)
    assert pytest.approx(5.480e6, rel=1e-4) == AB_ZERO_PHOTONS_S_CM2
    # "1000 photons/s/cm2/angstrom for V = 0 at 5500 A": a rule of thumb, from memory
    assert pytest.approx(996, abs=1) == AB_ZERO_PHOTONS_S_CM2 / 5500
    # f_lambda of AB = 0 at 5500 A, 3.6e-9 erg/s/cm2/A, over the energy of a photon
    # 1.98645e-8 / 5500 erg; f_lambda = 0.10885 / 5500^2 (Oke & Gunn 1983, from memory)
    assert (
        pytest.approx(0.10885 / 5500**2 / (1.98645e-8 / 5500), rel=1e-3)
        == AB_ZERO_PHOTONS_S_CM2 / 5500
    )


def test_photons_on_a_mirror():
    # 1 m without obstruction is 7854 cm2; AB = 20 is 1e-8 of magnitude 0
    telescope = Telescope("one", "ridge", 1.0, 0.0, 0.0, 0.0, 0.0, TimeAllotment())
    assert ab_photons_s_a(telescope, 20.0, 5500.0) == pytest.approx(996.3 * 7854 * 1e-8, rel=1e-3)
    # half the diameter in the middle takes a quarter of the light
    ring = Telescope("ring", "ridge", 1.0, 0.5, 0.0, 0.0, 0.0, TimeAllotment())
    assert ab_photons_s_a(ring, 20.0, 5500.0) == pytest.approx(
        0.75 * ab_photons_s_a(telescope, 20.0, 5500.0), rel=1e-12
    )


def test_howells_worked_example():
    # Howell (2006, Handbook of CCD Astronomy, 2nd edition, section 4.4), from memory: 300 s, one
    # pixel, gain 5 e/ADU, 24013 ADU of star, 620 ADU of sky, dark 22 e/pixel/h, read noise 5 e:
    # signal-to-noise about 342. Sky level from 200 pixels: 1 + 1/200, which we leave out.
    rates = Rates(24013 * 5 / 300, 620 * 5 / 300 + 22 / 3600, 25.0)
    assert 24013 * 5 / variance_e2(rates, 300.0, 1) ** 0.5 == pytest.approx(342, abs=0.5)
