"""Text with unit to a plain number."""

import math

import pytest
from astropy import units

from planner.base.quantities import in_unit, plain_number

TIME = "a time such as 20 min"


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("20 min", "s", 1200.0),
        ("20min", "s", 1200.0),
        ("2.5 nights", "d", 2.5),
        ("1 night", "d", 1.0),
        ("36 hours", "d", 1.5),
        ("35 %", "", 0.35),
        ("35%", "", 0.35),
        ("7 percent", "", 0.07),
        ("-30.4 deg", "deg", -30.4),
        ("−30.4 deg", "deg", -30.4),
        ("90 arcsec", "deg", 0.025),
        ("1.9 m", "m", 1.9),
        ("50 cm", "m", 0.5),
        ("4e3 km/s", "km/s", 4000.0),
        ("4000 km s-1", "km/s", 4000.0),
        ("3e7 Msun", "Msun", 3e7),
        ("80 Angstrom", "angstrom", 80.0),
        ("8 nm", "angstrom", 80.0),
        (".5 h", "min", 30.0),
        ("  5   d ", "d", 5.0),
    ],
)
def test_values(text, unit, value):
    assert in_unit(text, unit, "anything") == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize("name", ["s", "min", "h", "d", "wk", "yr"])
def test_conversion_is_that_of_the_unit_library(name):
    expected = (3.7 * units.Unit(name)).to_value("d")
    assert in_unit(f"3.7 {name}", "d", TIME) == pytest.approx(expected, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("20 m", "20 m is a length; expected a time such as 20 min"),
        ("20 deg", "20 deg is an angle; expected a time such as 20 min"),
        ("20", "20 has no unit; expected a time such as 20 min"),
        (
            "20 parsnips",
            "20 parsnips has an unknown unit 'parsnips'; expected a time such as 20 min",
        ),
        ("20 %", "20 % has the unit '%'; expected a time such as 20 min"),
        ("20 mag", "20 mag has the unit 'mag'; expected a time such as 20 min"),
        ("20 dex(cm)", "20 dex(cm) is a length; expected a time such as 20 min"),
        ("min", "min is not a number; expected a time such as 20 min"),
        ("", "an empty text is not a number; expected a time such as 20 min"),
        ("1_000 s", "1_000 s has an unknown unit '_000 s'; expected a time such as 20 min"),
        ("nan d", "nan d is not a finite number; expected a time such as 20 min"),
        (".inf", ".inf is not a finite number; expected a time such as 20 min"),
        ("1e999 d", "1e999 d is not a finite number; expected a time such as 20 min"),
        ("1e308 yr", "1e308 yr is not a finite number; expected a time such as 20 min"),
        ("1 " + "s" * 50, "expected a time such as 20 min"),
    ],
)
def test_refusals_are_sentences(text, message):
    with pytest.raises(ValueError, match=r".") as caught:
        in_unit(text, "s", TIME)
    assert str(caught.value).endswith(message)


@pytest.mark.parametrize("text", ["0.05", "5e-2", "+.05", " 0.05 "])
def test_plain_numbers(text):
    assert plain_number(text, "a redshift") == 0.05


@pytest.mark.parametrize("text", ["0.05 km", "0x10", "12:30", "1,5", "five", "NaN", "--1"])
def test_what_is_no_plain_number(text):
    with pytest.raises(ValueError, match="expected a redshift"):
        plain_number(text, "a redshift")


def test_long_text_is_cut_in_messages():
    with pytest.raises(ValueError, match=r"^x{60}\.\.\. is not a number") as caught:
        in_unit("x" * 10_000, "s", TIME)
    assert math.isclose(len(str(caught.value)), 100, abs_tol=20)
