"""Tables, numbers and progress for the terminal."""

from __future__ import annotations

import atexit
import os
import sys
import time
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from rich.progress import Progress

__all__ = ["ProgressLine", "significant", "table_text"]

EVERY_S = 30.0
"""Least time between two lines of one stage, where there is no terminal."""


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


@dataclass
class _Stage:
    """A piece of work that is going on."""

    began_s: float
    told_s: float
    bar: Any = None


class ProgressLine:
    """Progress on stderr; a context manager.

    On a terminal a bar for each stage, which leaves one plain line when the stage is finished.
    Elsewhere plain lines: one when a stage begins, one when it ends, and between them one in
    `EVERY_S` at most. A stage that had nothing left to do when it was first heard of is not shown.

    Parameters
    ----------
    quiet : bool
        Show no progress; `say` speaks all the same.
    """

    def __init__(self, *, quiet: bool) -> None:
        self._quiet = quiet
        self._live = sys.stderr.isatty() and os.environ.get("TERM", "dumb") not in {"dumb", ""}
        self._stages: dict[str, _Stage] = {}
        self._display: Progress | None = None

    def __call__(self, what: str, done: int, total: int, note: str = "") -> None:
        """Show that `done` of `total` tasks of a stage are finished, and a remark."""
        if self._quiet:
            return
        now = time.monotonic()
        stage = self._stages.get(what)
        if done >= total:
            if stage is not None:
                self._end(what, stage)
                self.say(f"{what}: {total} in {_span(now - stage.began_s)}")
        elif self._live:
            self._draw(what, done, total, note)
        elif stage is None or now - stage.told_s >= EVERY_S:
            self.say(f"{what}: {done}/{total}{', ' if note else ''}{note}")
            self._stages.setdefault(what, _Stage(now, now)).told_s = now

    def say(self, text: str) -> None:
        """Write one line on stderr, above whatever is drawn there."""
        if self._display is not None:
            self._display.console.print(text, markup=False, highlight=False, soft_wrap=True)
        else:
            sys.stderr.write(text + "\n")
            sys.stderr.flush()

    def close(self) -> None:
        """Leave the terminal as it was."""
        self._stages.clear()
        display, self._display = self._display, None
        if display is not None:
            display.stop()
            atexit.unregister(self.close)

    def __enter__(self) -> ProgressLine:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def _draw(self, what: str, done: int, total: int, note: str) -> None:
        if self._display is None:
            self._display = _bars()
            self._display.start()
            atexit.register(self.close)  # whoever does not close it still gets the cursor back
        stage = self._stages.get(what)
        if stage is None:
            now = time.monotonic()
            bar = self._display.add_task(what, total=total, completed=done, note=note)
            self._stages[what] = _Stage(now, now, bar)
        else:
            self._display.update(stage.bar, total=total, completed=done, note=note)

    def _end(self, what: str, stage: _Stage) -> None:
        del self._stages[what]
        if self._display is not None:
            self._display.remove_task(stage.bar)
        if not self._stages:
            self.close()


def _bars() -> Progress:
    """Return the drawing of bars; a narrow terminal gets less of it."""
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, ProgressColumn, TextColumn
    from rich.progress import Progress as Bars
    from rich.progress import TimeRemainingColumn as TimeColumn
    from rich.table import Column

    console = Console(file=sys.stderr)
    what, note = (
        TextColumn("{task." + field + "}", markup=False, table_column=Column(no_wrap=True))
        for field in ("description", "fields[note]")
    )
    columns: list[ProgressColumn] = [what, MofNCompleteColumn(table_column=Column(no_wrap=True))]
    if console.width >= 40:
        bar = BarColumn(bar_width=None, table_column=Column(ratio=1, min_width=8, max_width=40))
        columns.insert(1, bar)
        columns.append(TimeColumn(compact=True, table_column=Column(no_wrap=True)))
    if console.width >= 60:
        columns.append(note)
    return Bars(
        *columns, console=console, transient=True, redirect_stdout=False, refresh_per_second=4
    )


def _span(seconds: float) -> str:
    """Return a length of time in words."""
    if seconds < 100:
        return f"{seconds:.0f} s"
    minutes = round(seconds / 60)
    return f"{minutes} min" if minutes < 100 else f"{minutes // 60} h {minutes % 60} min"
