"""Numbers worked out once by hand from published formulas, and published numbers."""

import math

import pytest

from planner.agn import RELATIONS, damped_random_walk, lag_rest
from planner.agn.luminosity import _typical_host, log_luminosity
from planner.agn.variability import absolute_i_mag
from planner.model.campaign import Cosmology


@pytest.mark.parametrize(
    ("ab_mag", "wavelength_a", "redshift", "expected"),
    [
        (16.0, 4770, 0.03, 43.250),
        (16.0, 6231, 0.03, 43.199),
        (17.5, 4770, 0.10, 43.723),
        (19.0, 6231, 0.50, 44.575),
        (19.0, 7625, 0.50, 44.536),
        (19.0, 7625, 1.00, 45.202),
    ],
)
def test_luminosity_at_5100_worked_by_hand(ab_mag, wavelength_a, redshift, expected):
    # H0 = 70, Omega_m = 0.3, f_nu ~ nu^-0.44, no dust, no host
    found = log_luminosity(ab_mag, wavelength_a, redshift, 5100, Cosmology())
    assert found == pytest.approx(expected, abs=6e-4)


@pytest.mark.parametrize(
    ("key", "iron", "lags"),
    [  # days at log L5100 = 42, 43, 44, 45, 46, from each paper's formula
        ("bentz2013", 0.0, (2.9, 9.9, 33.7, 115, 392)),
        ("bentz2013_extinction", 0.0, (2.9, 10.2, 36.2, 128, 454)),
        ("duwang2019", 0.0, (5.6, 15.8, 44.7, 126, 355)),
        ("duwang2019", 0.5, (3.8, 10.6, 29.9, 84, 237)),
        ("duwang2019", 1.5, (1.7, 4.7, 13.3, 38, 106)),
        ("dallabonta2020", 0.0, (3.4, 10.3, 31.3, 95, 288)),
    ],
)
def test_hbeta_lags(key, iron, lags):
    for log_lum, expected in zip((42, 43, 44, 45, 46), lags, strict=True):
        found = lag_rest(RELATIONS["Hbeta"][key], log_lum, iron)
        assert found == pytest.approx(expected, rel=0.02)


@pytest.mark.parametrize(
    ("line", "key", "lags"),
    [  # days at log L = 45, 46 (Mg II, 3000 angstrom) and 45, 46, 47 (C IV, 1350 angstrom)
        ("MgII", "zajacek2021", (93, 185)),
        ("CIV", "kaspi2021", (20, 56, 158)),
        ("CIV", "lira2018", (18, 53, 152)),
        ("CIV", "kaspi2007", (30, 107, 380)),
    ],
)
def test_ultraviolet_lags(line, key, lags):
    for log_lum, expected in zip((45, 46, 47), lags, strict=False):
        assert lag_rest(RELATIONS[line][key], log_lum) == pytest.approx(expected, rel=0.03)


def test_the_luminous_quasar_he_0435_4312_within_the_scatter():
    # 296 d in the rest frame at log L3000 = 46.4 (Zajacek et al. 2021, abstract)
    relation = RELATIONS["MgII"]["zajacek2021"]
    assert abs(math.log10(296 / lag_rest(relation, 46.4))) < relation.scatter_dex


@pytest.mark.parametrize(
    ("wavelength_a", "i_mag", "log_mass", "sf_inf_mag", "tau_d"),
    [  # MacLeod et al. (2010, ApJ 721, 1014, table 1), worked by hand
        (4000, -23.0, 9.0, 0.309, 251),
        (4770, -20.0, 7.5, 0.377, 154),
        (3180, -25.0, 8.5, 0.153, 165),
    ],
)
def test_damped_random_walk(wavelength_a, i_mag, log_mass, sf_inf_mag, tau_d):
    amplitude_mag, timescale_d = damped_random_walk(wavelength_a, i_mag, log_mass)
    assert amplitude_mag * math.sqrt(2) == pytest.approx(sf_inf_mag, abs=6e-4)
    assert timescale_d == pytest.approx(tau_d, abs=0.6)


def test_i_magnitude_is_brighter_at_redshift_2_by_the_k_correction():
    # -20.232 at 5100 angstrom for log L = 43.5; redder by the power law to 7490 angstrom, then
    # brighter by 2.5 x 0.56 x log10(3) = 0.668
    red = 2.5 * 0.44 * math.log10(7490 / 5100)
    assert absolute_i_mag(43.5, 5100) == pytest.approx(-20.232 - red - 0.668, abs=2e-3)


@pytest.mark.parametrize(
    ("log_total", "ratio"), [(44.0, 0.805), (44.5, 0.238), (45.0, 0.009), (45.2, 0.0)]
)
def test_host_to_quasar_ratio(log_total, ratio):
    # Shen et al. (2011, ApJS 194, 45, eq. 1), from memory, worked by hand
    share = _typical_host(log_total)
    assert share / (1 - share) == pytest.approx(ratio, abs=1e-3)
