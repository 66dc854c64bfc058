"""What the commands have in common: reading, the output folder, printing."""

from __future__ import annotations

import json
import sys
from argparse import Namespace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from planner.base.files import claim_folder

if TYPE_CHECKING:
    from astropy.table import Table

    from planner.campaign import Reading
    from planner.scoring import Store

__all__ = ["CAUTION", "claim", "give", "read", "say", "say_json", "store_in"]

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


def store_in(folder: Path | None) -> Store:
    """Return the store of finished trials; without a folder nothing is kept."""
    from planner.scoring import Store

    return Store(None if folder is None else folder / WORK_FILE)


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
