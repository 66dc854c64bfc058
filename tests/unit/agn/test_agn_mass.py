import math

import pytest
from astropy import constants, units

from planner.agn import log_mass, log_virial_product, mass_error_dex


def test_unit_is_c_day_velocity_squared_over_g():
    product = (
        constants.c * units.day * (1000 * units.km / units.s) ** 2 / constants.G / constants.M_sun
    )
    assert log_virial_product(1.0, 1000.0) == pytest.approx(
        math.log10(product.to_value(units.one)), abs=1e-5
    )


def test_mass_grows_with_lag_and_with_the_square_of_the_width():
    assert log_mass(20.0, 4000.0) - log_mass(10.0, 4000.0) == pytest.approx(math.log10(2))
    assert log_mass(10.0, 8000.0) - log_mass(10.0, 4000.0) == pytest.approx(math.log10(4))


def test_virial_factor_of_the_width_is_1_12():
    # Woo et al. (2015, ApJ 801, 38): f = 1.12 for the full width at half maximum
    assert 10 ** (log_mass(10.0, 4000.0) - log_virial_product(10.0, 4000.0)) == pytest.approx(
        1.12, abs=0.005
    )


def test_mass_error_is_dominated_by_the_virial_factor():
    assert mass_error_dex(0.0) == pytest.approx(math.hypot(0.39, 0.0434), abs=1e-3)
    assert mass_error_dex(0.3) == pytest.approx(
        math.sqrt(0.39**2 + 0.0434**2 + 0.1303**2), abs=1e-3
    )
    assert mass_error_dex(0.1) < mass_error_dex(0.3) < mass_error_dex(1.0)
