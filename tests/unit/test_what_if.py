from pathlib import Path

import pytest

from planner.base.errors import InputError
from planner.what_if import WhatIf

FILE = Path(__file__).parents[1] / "cli" / "small.yaml"


@pytest.fixture(scope="module")
def asking():
    return WhatIf(FILE)


def test_a_change_is_answered_and_the_same_question_gets_the_same_answer(asking):
    layout = asking.layouts("One")[0]
    plain = asking.ask("One", layout)
    assert plain == asking.ask("One") == asking.ask("One", layout, shift_d=0.0)
    longer = asking.ask("One", layout, season_length_d=150.0)
    assert longer.layout.season_length_d == 150.0
    assert longer.success > plain.success
    assert longer.hours > plain.hours


def test_exposures_and_shifts_can_be_asked_for(asking):
    layout = asking.layouts("One")[0]
    plain, deep = asking.ask("One", layout), asking.ask("One", layout, exposure_line=4.0)
    assert deep.error < plain.error
    assert deep.hours > plain.hours
    later = asking.ask("One", layout, shift_d=30.0)
    assert later.layout.shift_d == 30.0
    assert later != plain


def test_what_is_not_known_is_said(asking):
    with pytest.raises(InputError, match="no target Three; expected one of One, =Two, North"):
        asking.ask("Three")
    with pytest.raises(InputError, match="no field cadence; expected any of cadence_line_nights"):
        asking.ask("One", cadence=3.0)


def test_a_target_that_is_never_up_promises_nothing(asking):
    assert asking.ask("North").success == 0.0
