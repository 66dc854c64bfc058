"""Text with a unit, as an observer writes it, to a plain float in the unit that is wanted.

The caller says in words what it expects ("a time such as 20 min"); every refusal is one sentence
of the form ``what was found; expected what would do``.
"""

from __future__ import annotations

import math
import re
import warnings
from functools import lru_cache

__all__ = ["in_unit", "plain_number", "shown", "split"]

_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_NOT_FINITE = re.compile(r"[+-]?\.?(?:nan|inf|infinity)\b", re.IGNORECASE)
_LONGEST_UNIT = 40

# English words that the unit library does not know, and the observer's night.
_WORDS = {
    "night": "d", "nights": "d", "day": "d", "days": "d",
    "hr": "h", "hrs": "h", "hour": "h", "hours": "h",
    "mins": "min", "minute": "min", "minutes": "min",
    "sec": "s", "secs": "s", "second": "s", "seconds": "s",
    "year": "yr", "years": "yr", "week": "wk", "weeks": "wk",
    "metre": "m", "metres": "m", "meter": "m", "meters": "m",
    "degree": "deg", "degrees": "deg", "°": "deg",
    "angstroms": "angstrom", "percent": "%",
}  # fmt: skip


def split(text: str, expected: str) -> tuple[float, str]:
    """Split `text` into its number and what follows it.

    Parameters
    ----------
    text : str
        Such as ``"20 min"`` or ``"0.05"``; a Unicode minus counts as a minus.
    expected : str
        What would do, in words, for the error's sentence.

    Returns
    -------
    value : float
        Finite.
    unit : str
        The rest, stripped; empty for a bare number.

    Raises
    ------
    ValueError
        If `text` does not begin with a finite number.
    """
    clean = text.strip().replace("−", "-")
    match = _NUMBER.match(clean)
    value = float(match.group()) if match else math.nan
    if _NOT_FINITE.match(clean) or (match and not math.isfinite(value)):
        raise ValueError(f"{shown(text)} is not a finite number; expected {expected}")
    if not match:
        raise ValueError(f"{shown(text)} is not a number; expected {expected}")
    return value, clean[match.end() :].strip()


def plain_number(text: str, expected: str) -> float:
    """Return the number that `text` is, without any unit.

    Raises
    ------
    ValueError
        If `text` is anything else than one finite decimal number.
    """
    value, rest = split(text, expected)
    if rest:
        raise ValueError(f"{shown(text)} is not a bare number; expected {expected}")
    return value


def in_unit(text: str, unit: str, expected: str) -> float:
    """Return the quantity written in `text` in the given unit.

    Parameters
    ----------
    text : str
        Number and unit, such as ``"20 min"``, ``"30 %"``, ``"2.5 nights"`` or ``"4000 km/s"``. A
        night counts as a day.
    unit : str
        Name of an astropy unit; ``""`` for a plain ratio (``30 %`` gives 0.3).
    expected : str
        What would do, in words, such as ``"a time such as 20 min"``.

    Raises
    ------
    ValueError
        If there is no finite number or no unit, the unit is unknown or of another kind.
    """
    value, found = split(text, expected)
    if not found:
        raise ValueError(f"{shown(text)} has no unit; expected {expected}")
    try:
        factor, inverse = _factors(_WORDS.get(found.lower(), found), unit)
    except ValueError as error:
        raise ValueError(f"{shown(text)} {error}; expected {expected}") from None
    # Dividing by 100 keeps 35 % at 0.35, where multiplying by 0.01 would not.
    result = value * factor if factor >= 1 else value / inverse
    if not math.isfinite(result):
        raise ValueError(f"{shown(text)} is not a finite number; expected {expected}")
    return result


def shown(text: str, longest: int = 60) -> str:
    """Return `text` short and on one line, fit for a message."""
    line = text.strip() if text.isprintable() else repr(text)[1:-1]
    return f"{line[:longest]}..." if len(line) > longest else (line or "an empty text")


@lru_cache(maxsize=512)
def _factors(found: str, wanted: str) -> tuple[float, float]:
    """Return the factor from `found` to `wanted` and its inverse.

    Raises
    ------
    ValueError
        With the end of a sentence that starts with the quantity.
    """
    unknown = ValueError(f"has an unknown unit '{shown(found)}'")
    if len(found) > _LONGEST_UNIT:
        raise unknown
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # remarks on old spellings and on the user's settings
        from astropy import units

        target = units.Unit(wanted)
        try:
            unit = units.Unit(found)
            kind = str(unit.physical_type).split("/")[0]
        except (ValueError, TypeError, ArithmeticError, AttributeError):
            raise unknown from None
        try:
            return float(unit.to(target)), float(target.to(unit))
        except (ValueError, TypeError, ArithmeticError):
            article = "an" if kind[0] in "aeiou" else "a"
            known = kind not in {"unknown", "dimensionless"}
            raise ValueError(
                f"is {article} {kind}" if known else f"has the unit '{found}'"
            ) from None
