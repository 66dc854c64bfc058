"""The planner's error tree.

PlannerError
├── InputError      the observer's file or options are wrong      exit status 2
├── OutputError     the results cannot be written                 exit status 2
└── PlanError       the input is sound, but no plan can be made   exit status 1

Library code raises; only the command line catches, prints and sets the status.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["InputError", "OutputError", "PlanError", "PlannerError", "Problem"]


@dataclass(frozen=True)
class Problem:
    """One fault in the input: where it stands, what was found and what would do.

    ``str(problem)`` is the one line an observer reads.
    """

    file: str
    line: int | None
    key: str
    found: str
    expected: str

    def __str__(self) -> str:
        """Render as ``file:line: key: found X; expected Y``."""
        place = self.file if self.line is None else f"{self.file}:{self.line}"
        key = f" {self.key}:" if self.key else ""
        expected = f"; expected {self.expected}" if self.expected else ""
        return f"{place}:{key} {self.found}{expected}"


class PlannerError(Exception):
    """Anything that ends a command with a message instead of a result."""

    exit_status = 1


class InputError(PlannerError):
    """The input cannot be used; carries every `Problem` found, not just the first."""

    exit_status = 2

    def __init__(self, problems: str | Problem | list[Problem]) -> None:
        if isinstance(problems, Problem):
            problems = [problems]
        self.problems: list[Problem] = problems if isinstance(problems, list) else []
        super().__init__(
            problems if isinstance(problems, str) else "\n".join(str(p) for p in problems)
        )


class OutputError(PlannerError):
    """The results cannot be written where they were asked for."""

    exit_status = 2


class PlanError(PlannerError):
    """The input is sound, but no plan can be made from it."""

    exit_status = 1
