import pytest

from planner.agn.bands import BANDS, extinction_mag

# A/E(B-V) for R_V = 3.1 of Schlafly & Finkbeiner (2011, ApJ 737, 103, table 6), which are for the
# E(B-V) of Schlegel et al. (1998) and so hold the factor 0.86; B, V, R from memory. They are
# averages over each band of a galaxy spectrum, normalised in the infrared: 6 per cent is the
# difference to be expected from monochromatic values.
SCHLAFLY_FINKBEINER = {
    "u": 4.239, "g": 3.303, "r": 2.285, "i": 1.698, "z": 1.263, "B": 3.626, "V": 2.742, "R": 2.169,
}  # fmt: skip


@pytest.mark.parametrize("band", BANDS)
def test_extinction_agrees_with_published_band_averages(band):
    expected = SCHLAFLY_FINKBEINER[band] / 0.86
    assert extinction_mag(BANDS[band].pivot_a, 1.0) == pytest.approx(expected, rel=0.06)


def test_extinction_is_proportional_to_reddening_and_near_r_v_in_the_visual():
    assert extinction_mag(5478.0, 0.0) == 0.0
    assert extinction_mag(5478.0, 0.4) == pytest.approx(4 * extinction_mag(5478.0, 0.1), rel=1e-12)
    assert extinction_mag(5478.0, 1.0) == pytest.approx(3.1, rel=0.03)


def test_extinction_falls_towards_the_red():
    values = [extinction_mag(w, 1.0) for w in (1500, 3000, 4000, 5500, 7000, 9000, 12000)]
    assert values == sorted(values, reverse=True)
