"""What all sections of the file have in common: strict keys and usual values in plain sight."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any

from pydantic import BaseModel, ConfigDict, Field

__all__ = ["COMMON", "Default", "Section", "defaults_taken", "nearest", "needed", "usual"]

COMMON = "common practice, no source"


@dataclass(frozen=True, slots=True)
class Default:
    """A value that the observer did not give."""

    key: str
    """Such as ``streams.line.exposure``."""
    value: str
    """As an observer would write it, with unit."""
    reason: str
    """Why this value: a source or a few words."""


class Section(BaseModel):
    """A section of the file: only the keys it declares; a key that is left empty is left out."""

    model_config = ConfigDict(extra="forbid", frozen=True, strict=True)


def usual(value: object, reason: str = COMMON) -> Any:
    """Declare a key that may be left out; `value` is written as in the file."""
    return Field(default=value, validate_default=True, json_schema_extra={"reason": reason})


def needed(expected: str) -> Any:
    """Declare a key that must be there, and what it is to look like."""
    return Field(json_schema_extra={"expected": expected})


def nearest(word: str, known: Iterable[str]) -> str:
    """Return the known word that `word` most likely means, or ``""``."""
    lower = {k.lower(): k for k in known}
    found = get_close_matches(word.lower(), lower, n=1, cutoff=0.6)
    return lower[found[0]] if found else ""


def defaults_taken(section: Section, prefix: str) -> Iterator[Default]:
    """Yield the default of every key that was left out of `section` or of a section in it."""
    for name, info in type(section).model_fields.items():
        value = getattr(section, name)
        key = f"{prefix}.{name}" if prefix else name
        extra = info.json_schema_extra
        if name not in section.model_fields_set and isinstance(extra, dict) and "reason" in extra:
            yield Default(key, _as_written(info.default), str(extra["reason"]))
        elif isinstance(value, Section):
            yield from defaults_taken(value, key)


def _as_written(default: object) -> str:
    if isinstance(default, Sequence) and not isinstance(default, str):
        return f"[{', '.join(str(d) for d in default)}]"
    return str(default)
