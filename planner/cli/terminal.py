"""Tables, numbers and progress for the terminal."""

from __future__ import annotations

import sys
import time
from collections.abc import Sequence

__all__ = ["ProgressLine", "significant", "table_text"]


def table_text(header: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """Return an aligned text table: words to the left, numbers to the right."""
    columns = list(zip(header, *rows, strict=True))
    widths = [max(len(cell) for cell in column) for column in columns]
    right = [all(_is_number(cell) for cell in column[1:]) for column in columns]
    lines = []
    for row in [header, ["-" * w for w in widths], *rows]:
        cells = [
            cell.rjust(w) if r else cell.ljust(w)
            for cell, w, r in zip(row, widths, right, strict=True)
        ]
        lines.append("  ".join(cells).rstrip())
    return "\n".join(lines)


def _is_number(cell: str) -> bool:
    return not cell or cell[0].isdigit() or cell[0] in "-+–~"


def significant(value: float, digits: int = 2) -> str:
    """Return a number with so many significant digits, never in exponent form."""
    if value != value:  # noqa: PLR0124  NaN
        return "–"
    if value == 0:
        return "0"
    rounded = float(f"{value:.{digits}g}")
    return f"{rounded:.0f}" if abs(rounded) >= 10 ** (digits - 1) else f"{rounded:g}"


class ProgressLine:
    """Progress on stderr: one line that rewrites itself on a terminal, a line a stage elsewhere."""

    def __init__(self, *, quiet: bool) -> None:
        self._quiet = quiet
        self._live = sys.stderr.isatty()
        self._started: dict[str, float] = {}

    def __call__(self, what: str, done: int, total: int) -> None:
        """Show that `done` of `total` tasks of a stage are finished."""
        if self._quiet or total == 0:
            return
        first = what not in self._started
        start = self._started.setdefault(what, time.monotonic())
        seconds = time.monotonic() - start
        if done == total:
            del self._started[what]
        if self._live:
            end = f" in {seconds:.0f} s\n" if done == total else "\r"
            sys.stderr.write(f"{what}: {done}/{total}{end}")
        elif done == total:
            sys.stderr.write(f"{what}: {total}/{total} in {seconds:.0f} s\n")
        elif first:
            sys.stderr.write(f"{what}: {done}/{total}\n")
        sys.stderr.flush()
