import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.model.observatory import WeatherClimate
from planner.weather import clear_nights, expected_clear, impossible

FIRST = 61100  # 2026-03-01

climates = st.builds(
    WeatherClimate,
    clear_fraction=st.tuples(
        *[st.one_of(st.sampled_from([0.0, 1.0, 0.5]), st.floats(0.01, 0.99))] * 12
    ),
    bad_spell_nights=st.floats(1, 20),
)


def twin(climate, nights, uniforms):
    """Night after night, trial after trial."""
    dates = np.datetime64("1858-11-17") + nights
    p = [climate.clear_fraction[d.astype(object).month - 1] for d in dates]
    out = np.zeros(uniforms.shape, dtype=bool)
    for trial, draws in enumerate(uniforms):
        clear = draws[0] < p[0]
        out[trial, 0] = clear
        for t in range(1, len(p)):
            was, now = p[t - 1], p[t]
            after_lost = 1 / climate.bad_spell_nights
            if was < 1:
                after_lost = max(after_lost, (now - was) / (1 - was))
                after_lost = min(after_lost, now / (1 - was), 1.0)
            after_clear = after_lost
            if was > 0:
                after_clear = (now - (1 - was) * after_lost) / was
                after_clear = min(max(after_clear, 0.0), 1.0)
            clear = draws[t] < (after_clear if clear else after_lost)
            out[trial, t] = clear
    return out


@settings(deadline=None, max_examples=60)
@given(climates, st.integers(1, 90), st.integers(0, 400), st.integers(0, 2**32 - 1))
def test_agrees_with_the_chain_followed_night_by_night(climate, count, start, seed):
    nights = np.arange(FIRST + start, FIRST + start + count)
    uniforms = np.random.default_rng(seed).uniform(size=(8, count))
    assert np.array_equal(clear_nights(climate, nights, uniforms), twin(climate, nights, uniforms))


def test_months_follow_the_calendar():
    climate = WeatherClimate(tuple(0.05 * (m + 1) for m in range(12)), 2.0)
    nights = np.array([61099, 61100, 61130, 61131, 61405, 61406])
    # 2026-02-28, 03-01, 03-31, 04-01, 12-31, 2027-01-01
    assert expected_clear(climate, nights) == pytest.approx([0.10, 0.15, 0.15, 0.20, 0.60, 0.05])


def test_closed_and_cloudless_months():
    climate = WeatherClimate((1.0,) * 6 + (0.0,) + (1.0,) * 5, 3.0)
    nights = np.arange(FIRST, FIRST + 365)
    clear = clear_nights(climate, nights, np.random.default_rng(0).uniform(size=(20, 365)))
    assert np.array_equal(clear, np.tile(expected_clear(climate, nights) == 1.0, (20, 1)))


def test_one_night_and_no_night():
    climate = WeatherClimate((0.6,) * 12, 2.0)
    one = clear_nights(climate, np.array([FIRST]), np.array([[0.59], [0.61]]))
    assert one.tolist() == [[True], [False]]
    assert clear_nights(climate, np.array([], dtype=np.int64), np.empty((3, 0))).shape == (3, 0)


def test_more_luck_never_means_fewer_clear_nights_where_weather_persists():
    climate = WeatherClimate((0.6,) * 12, 2.5)
    nights = np.arange(FIRST, FIRST + 200)
    uniforms = np.random.default_rng(5).uniform(size=(50, 200))
    clear = clear_nights(climate, nights, uniforms)
    assert np.all(clear_nights(climate, nights, uniforms * 0.9) >= clear)


def test_impossibly_short_spells_are_named():
    fraction = (0.8,) * 6 + (0.2, 0.25, 0.0) + (0.8,) * 3
    assert impossible(WeatherClimate(fraction, 2.5)) == (
        "bad spells of 2.5 nights on average are too short for so few clear nights in July, "
        "August: they must last at least 4.0 nights"
    )
    assert impossible(WeatherClimate(fraction, 4.0)) is None
    assert impossible(WeatherClimate((0.5,) * 12, 1.0)) is None
