"""Simulated weather has the climate that was asked for, within sampling error (4 sigma)."""

import numpy as np
import pytest

from planner.model.observatory import WeatherClimate
from planner.weather import clear_nights, expected_clear, impossible

pytestmark = pytest.mark.statistical

FIRST = 61041  # 2026-01-01
TRIALS, NIGHTS = 200, 2000

# Clear share of each month at a Chilean site: photometric hours over possible hours, Cerro
# Tololo 1965-1989
TOLOLO = (0.79, 0.83, 0.77, 0.64, 0.43, 0.40, 0.42, 0.48, 0.52, 0.56, 0.67, 0.80)


def simulate(climate, trials=TRIALS, nights=NIGHTS, seed=11):
    dates = np.arange(FIRST, FIRST + nights)
    uniforms = np.random.default_rng(seed).uniform(size=(trials, nights))
    return dates, clear_nights(climate, dates, uniforms)


def bad_spells(clear):
    """Lengths of the spells of lost nights that both begin and end inside a trial."""
    lengths = []
    for row in clear:
        edges = np.flatnonzero(np.diff(row.astype(int)))
        begins = edges[row[edges]]
        ends = edges[~row[edges]]
        ends = ends[ends > begins[0]] if begins.size else ends[:0]
        lengths.append(ends - begins[: ends.size])
    return np.concatenate(lengths)


@pytest.mark.parametrize(
    ("p", "b"), [(0.7, 2.5), (0.9, 1.5), (0.4, 3.0), (0.6, 6.0), (0.5, 1.2), (0.3, 2.5)]
)
def test_constant_climate(p, b):
    climate = WeatherClimate((p,) * 12, b)
    assert impossible(climate) is None
    _, clear = simulate(climate)
    # rho = P(clear | clear) - P(clear | lost) = 1 - (1 - p) / (p b) - 1 / b = 1 - 1 / (p b)
    rho = 1 - 1 / (p * b)
    effective = clear.size * (1 - rho) / (1 + rho)
    assert abs(clear.mean() - p) < 4 * np.sqrt(p * (1 - p) / effective)

    lengths = bad_spells(clear)
    assert abs(lengths.mean() - b) < 4 * np.sqrt(b * (b - 1) / lengths.size)
    for k in range(1, 5):  # spells are geometric
        share = (1 - 1 / b) ** k
        sigma = np.sqrt(share * (1 - share) / lengths.size)
        assert abs(np.mean(lengths > k) - share) < 4 * sigma

    x = (clear - p) / np.sqrt(p * (1 - p))
    for lag in (1, 2, 3):
        products = np.mean(x[:, lag:] * x[:, :-lag], axis=1)
        assert abs(products.mean() - rho**lag) < 4 * products.std(ddof=1) / np.sqrt(TRIALS)


@pytest.mark.parametrize("b", [1.5, 2.5, 5.0])
def test_every_night_of_a_monthly_climate_has_its_chance(b):
    climate = WeatherClimate(TOLOLO, b)
    dates, clear = simulate(climate, trials=6000, nights=365)
    p = expected_clear(climate, dates)
    z = (clear.mean(axis=0) - p) / np.sqrt(p * (1 - p) / 6000)
    assert np.abs(z).max() < 4.5  # 365 nights, the first of each month among them
    # neighbouring nights are correlated, hence a wide margin about 1
    assert 0.5 < np.mean(z**2) < 1.6


def test_steep_change_of_month_keeps_the_chance():
    climate = WeatherClimate((0.9, 0.1, 0.95) * 4, 9.5)
    dates, clear = simulate(climate, trials=6000, nights=200)
    p = expected_clear(climate, dates)
    z = (clear.mean(axis=0) - p) / np.sqrt(p * (1 - p) / 6000)
    assert np.abs(z).max() < 4.5


def test_bad_spells_within_the_months_of_a_monthly_climate():
    climate = WeatherClimate(TOLOLO, 2.5)
    assert impossible(climate) is None
    dates, clear = simulate(climate, trials=1000, nights=730)
    p = expected_clear(climate, dates)
    same_month = np.diff(p) == 0
    lost = ~clear[:, :-1][:, same_month]
    ended = clear[:, 1:][:, same_month] & lost
    share = ended.sum() / lost.sum()
    assert abs(share - 0.4) < 4 * np.sqrt(0.4 * 0.6 / lost.sum())
    assert bad_spells(clear).mean() == pytest.approx(2.5, rel=0.05)  # those across months too


def test_impossible_climate_keeps_the_clear_fraction_and_lengthens_the_spells():
    climate = WeatherClimate((0.2,) * 12, 2.5)
    assert impossible(climate) is not None
    _, clear = simulate(climate)
    assert clear.mean() == pytest.approx(0.2, abs=0.002)
    assert bad_spells(clear).mean() == pytest.approx(4.0, rel=0.01)
    assert not np.any(clear[:, 1:] & clear[:, :-1])  # clear nights stand alone
