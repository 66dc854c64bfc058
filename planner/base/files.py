"""Writing results so that a file is either whole or not there."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from planner.base.errors import OutputError

__all__ = ["MARK", "claim_folder", "replacing", "write_bytes"]

MARK = ".planner-run"
"""Name of the file that marks a folder as one the planner may write into."""


@contextmanager
def replacing(path: Path) -> Iterator[Path]:
    """Yield a temporary name beside `path`; rename it onto `path` when the block succeeds.

    Raises
    ------
    OutputError
        If the file cannot be written (no permission, no such folder, disk full). Nothing
        half-written is left behind.
    """
    temporary = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        yield temporary
        temporary.replace(path)
    except OSError as error:
        reason = error.strerror or str(error)
        raise OutputError(f"{path}: cannot be written: {reason}") from error
    finally:
        with suppress(OSError):
            temporary.unlink(missing_ok=True)


def write_bytes(path: Path, content: bytes) -> None:
    """Write `content` to `path`, whole or not at all. Raises `OutputError`."""
    with replacing(path) as temporary, temporary.open("wb") as file:
        file.write(content)
        file.flush()
        os.fsync(file.fileno())


def claim_folder(folder: Path, campaign_hash: str, *, replace: bool) -> None:
    """Make `folder` ours to write into, or say why it cannot be.

    A new or empty folder is taken. A folder of an earlier run of the same campaign (same inputs
    and options: an interrupted run that goes on) is taken as it is. A folder of another run needs
    ``replace=True``. A folder with something else's files is refused in any case.

    Raises
    ------
    OutputError
        With what to change.
    """
    mark = folder / MARK
    try:
        folder.mkdir(parents=True, exist_ok=True)
        held = [entry.name for entry in folder.iterdir() if not entry.name.endswith(".part")]
        if held and not mark.is_file():
            raise OutputError(
                f"{folder}: holds files that are not a plan (e.g. {sorted(held)[0]}); "
                "name a new or empty folder with --out"
            )
        if mark.is_file() and mark.read_text().strip() != campaign_hash and not replace:
            raise OutputError(
                f"{folder}: holds a plan made from other inputs or options; "
                "add --replace to overwrite it, or name another folder with --out"
            )
    except OSError as error:
        reason = error.strerror or str(error)
        raise OutputError(f"{folder}: cannot be used for the results: {reason}") from error
    write_bytes(mark, f"{campaign_hash}\n".encode())
