import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.kernels.epochs import nights_taken

ONE = np.array([0]), np.array([99])


def taken(usable, cadence, night=None, first=ONE[0], last=ONE[1]):
    usable = np.asarray(usable, dtype=bool)
    night = np.arange(usable.size) if night is None else np.asarray(night)
    return night[nights_taken(night, usable, first, last, float(cadence))].tolist()


def twin(night, usable, first, last, cadence):
    """The same rule, written as one would say it."""
    chosen = []
    for a, b in zip(first, last, strict=True):
        due = float(a)
        for n, clear in zip(night, usable, strict=True):
            if a <= n <= b and clear and n >= due:
                chosen.append(n)
                due = due + cadence if n - due < 1 else n + cadence
    return chosen


def test_clear_skies_keep_the_cadence():
    assert taken(np.ones(13), 4) == [0, 4, 8, 12]


def test_a_half_night_cadence_alternates():
    assert taken(np.ones(11), 2.5) == [0, 3, 5, 8, 10]


def test_a_lost_night_is_caught_up_and_the_rhythm_goes_on_from_there():
    usable = np.ones(12, dtype=bool)
    usable[[4, 5]] = False
    assert taken(usable, 4) == [0, 6, 10]


def test_each_season_starts_afresh():
    assert taken(np.ones(40), 7, first=np.array([0, 20]), last=np.array([9, 29])) == [0, 7, 20, 27]


@given(
    usable=st.lists(st.booleans(), min_size=0, max_size=60),
    cadence=st.sampled_from([1.0, 1.5, 2.0, 3.0, 7.0]),
    edge=st.integers(0, 30),
)
def test_kernel_equals_its_twin(usable, cadence, edge):
    usable = np.array(usable, dtype=bool)
    night = np.arange(usable.size) * 2
    first, last = np.array([0, 40]), np.array([edge, 90])
    assert taken(usable, cadence, night, first, last) == twin(night, usable, first, last, cadence)


def test_visits_never_come_closer_than_the_cadence_allows():
    rng = np.random.default_rng(1)
    for cadence in (1.0, 3.0, 5.5):
        chosen = taken(rng.random(100) < 0.6, cadence)
        assert np.diff(chosen).min() >= cadence - 1 + 1e-9 or cadence == pytest.approx(1.0)
