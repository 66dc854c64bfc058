"""The record of one run: enough to repeat it."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from planner.base.files import write_bytes

__all__ = ["run_json"]


def run_json(run: dict[str, Any], path: Path) -> None:
    """Write the run's provenance as JSON. Raises `OutputError`."""
    write_bytes(path, (json.dumps(run, indent=2, ensure_ascii=False) + "\n").encode())
