"""Moonlight against the values of Krisciunas & Schaefer (1991, PASP 103, 1033)."""

import numpy as np
import pytest

from planner.base.bands import BANDS
from planner.model.observatory import SkyQuality
from planner.sky import sky_ab_mag
from planner.sky.brightness import ALBEDO_SLOPE, SUN_AB_MAG

PIVOT_V, AB_V = BANDS["V"].pivot_a, BANDS["V"].ab_minus_vega_mag


def v_mag(quality, altitude, moon_altitude, phase_deg, separation):
    """Sky in V, Vega system, for a phase angle."""
    lit = (1 + np.cos(np.radians(phase_deg))) / 2
    ab = sky_ab_mag(quality, PIVOT_V, altitude, moon_altitude, lit, separation)
    return float(ab) - AB_V


def test_their_worked_example():
    moon_alone = SkyQuality(1.0, (("V", 99.0),), (("V", 0.15),))
    # zenith distances 20 (target) and 70 (moon), separation 50, phase angle 45 degrees
    assert v_mag(moon_alone, 70.0, 20.0, 45.0, 50.0) == pytest.approx(19.855, abs=5e-4)


# their model with k = 0.172 and 79.0 nL at the zenith, moon and target 45 degrees up; worked out
# from the published constants
TABLE = {
    0: (17.58, 18.26, 18.58),
    30: (18.32, 18.98, 19.27),
    60: (19.08, 19.67, 19.93),
    90: (19.88, 20.35, 20.53),
    120: (20.67, 20.93, 21.02),
}
MAUNA_KEA = SkyQuality(0.8, (("V", 21.587),), (("V", 0.172),))


@pytest.mark.parametrize("phase_deg", TABLE)
def test_table_over_phase_and_separation(phase_deg):
    for separation, expected in zip((30.0, 60.0, 90.0), TABLE[phase_deg], strict=True):
        total = 10 ** (-0.4 * v_mag(MAUNA_KEA, 45.0, 45.0, phase_deg, separation))
        dark = 10 ** (-0.4 * v_mag(MAUNA_KEA, 45.0, -1.0, phase_deg, separation))
        # the table leaves out the 35 per cent by which the moon brightens at opposition
        surge = 1.35 if phase_deg == 0 else 1.0
        ours = -2.5 * np.log10(dark + (total - dark) / surge)
        assert ours == pytest.approx(expected, abs=0.006)


def test_dark_sky_away_from_the_zenith():
    # eq. 2: B0 10^(-0.4 k (X - 1)) X with X = 1.3868 at 45 degrees
    expected = 21.587 + 0.172 * 0.3868 - 2.5 * np.log10(1.3868)
    assert v_mag(MAUNA_KEA, 45.0, -1.0, 0.0, 60.0) == pytest.approx(expected, abs=1e-4)


# wavelength (nm) and first coefficient of the logarithm of the full moon's disc reflectance:
# Kieffer & Stone (2005, AJ 129, 2887, table 4)
REFLECTANCE = {
    350.0: -2.67511, 355.1: -2.71924, 405.0: -2.35754, 414.4: -2.43367, 441.6: -2.31964,
    475.0: -2.28999, 486.9: -2.23351, 544.0: -2.13864, 553.8: -2.12504, 665.1: -1.88914,
    693.1: -1.89410, 763.7: -1.85258, 774.8: -1.80271, 865.3: -1.74561, 882.0: -1.73011,
}  # fmt: skip


def test_the_moons_reflectance():
    nm = np.array(list(REFLECTANCE))
    measured = 1.0857 * np.array(list(REFLECTANCE.values()))
    ours = 2.5 * ALBEDO_SLOPE * np.log10(nm)
    at_v = np.abs(nm - 549) < 6
    apart = (measured - measured[at_v].mean()) - (ours - ours[at_v].mean())
    assert np.abs(apart).max() < 0.15


def test_the_moon_is_redder_than_the_sun():
    # B - V of the moon is 0.92, the sun's 0.65 (Allen, Astrophysical Quantities; from memory)
    quality = SkyQuality(1.0, (("B", 99.0), ("V", 99.0)), (("B", 0.15), ("V", 0.15)))
    colour = [
        float(sky_ab_mag(quality, BANDS[b].pivot_a, 60.0, 40.0, 0.5, 90.0))
        - BANDS[b].ab_minus_vega_mag
        for b in "BV"
    ]
    assert colour[0] - colour[1] == pytest.approx(0.92, abs=0.08)
    sun = SUN_AB_MAG["B"] + 0.09 - (SUN_AB_MAG["V"] - AB_V)
    assert sun == pytest.approx(0.65, abs=0.04)
