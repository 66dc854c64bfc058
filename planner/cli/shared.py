"""What the commands have in common: reading, the output folder, printing."""

from __future__ import annotations

import json
import sys
from argparse import Namespace
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

from planner.base.files import claim_folder

if TYPE_CHECKING:
    from astropy.table import Table

    from planner.campaign import Reading
    from planner.model.campaign import Layout
    from planner.scoring import Tools

__all__ = [
    "CAUTION",
    "LAYOUT_HEADER",
    "claim",
    "give",
    "layout_cells",
    "read",
    "say",
    "say_json",
    "working",
]

CAUTION = (
    "A plan is no permission: the observatory's own limits, sun avoidance, safety rules "
    "and staff decide."
)
WORK_FILE = ".trials.sqlite"


def say(text: str) -> None:
    """Print a line of the result."""
    sys.stdout.write(text + "\n")


def say_json(result: dict[str, Any]) -> None:
    """Print the result as one JSON object."""
    say(json.dumps(result, ensure_ascii=False))


def read(options: Namespace) -> Reading:
    """Read the campaign file that the command names. Raises `InputError`."""
    from planner import pipeline

    return pipeline.read(options.file, options.seed)


def claim(options: Namespace, reading: Reading) -> Path | None:
    """Make the output folder ours, where one is asked for."""
    if options.out is None:
        return None
    from planner.base.provenance import planner_version
    from planner.scoring import key_of

    claim_folder(
        options.out,
        key_of(options.command, planner_version(), reading.campaign),
        replace=options.replace,
    )
    return Path(options.out)


@contextmanager
def working(options: Namespace, folder: Path | None) -> Iterator[Tools]:
    """Give what long work is done with; without a folder nothing is kept."""
    from planner.base.workers import Workers
    from planner.cli.terminal import ProgressLine
    from planner.scoring import Store, Tools

    with (
        ProgressLine(quiet=options.quiet) as progress,
        Workers(options.workers, options.cluster) as workers,
    ):
        store = Store(None if folder is None else folder / WORK_FILE, warn=progress.say)
        try:
            yield Tools(workers, store, progress)
        finally:
            store.close()


LAYOUT_HEADER = ["nights per spectrum", "per image", "seasons"]


def layout_cells(layout: Layout) -> list[str]:
    """Return a layout as cells under `LAYOUT_HEADER`."""
    seasons = f"{layout.seasons} × {layout.season_length_d:g} d"
    if layout.shift_d:
        seasons += f" {layout.shift_d:+g} d"
    factors = layout.exposures
    return [
        f"{layout.cadence_line_nights:g}" + (f" × {factors[0]:g}" if factors[0] != 1 else ""),
        f"{layout.cadence_continuum_nights:g}" + (f" × {factors[1]:g}" if factors[1] != 1 else ""),
        seasons,
    ]


def give(options: Namespace, folder: Path | None, tables: dict[str, Table]) -> bool:
    """Write tables to the folder and print them as JSON, where asked; say whether printed."""
    from planner import export

    if folder is not None:
        for name, table in tables.items():
            export.write_ecsv(table, folder / f"{name}.ecsv")
    if options.json:
        say_json({name: export.as_rows(table) for name, table in tables.items()})
        return True
    return False
