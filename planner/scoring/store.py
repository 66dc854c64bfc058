"""Results kept on disk, so that an interrupted run goes on where it stopped."""

from __future__ import annotations

import contextlib
import hashlib
import io
import pickle
import sqlite3
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import OutputError

__all__ = ["Store", "key_of"]


def key_of(*parts: Any) -> str:
    """Return a key that changes whenever anything a result depends on does.

    Parts are records, plain values and arrays; they are hashed by content.
    """
    digest = hashlib.sha256()
    for part in parts:
        digest.update(pickle.dumps(_plain(part), protocol=4))
    return digest.hexdigest()


def _plain(value: Any) -> Any:
    """Turn records and arrays into values whose pickle depends on their content alone."""
    if isinstance(value, np.ndarray):
        return (value.dtype.str, value.shape, value.tobytes())
    if hasattr(value, "__dataclass_fields__"):
        return (
            type(value).__name__,
            [(n, _plain(getattr(value, n))) for n in value.__dataclass_fields__],
        )
    if isinstance(value, (tuple, list)):
        return [_plain(v) for v in value]
    # repr, not the value: pickle writes an object that it has met before as a reference, so equal
    # content could give different bytes.
    return repr(value)


class Store:
    """An embedded database of finished tasks, one row each; ``Store(None)`` keeps nothing.

    Parameters
    ----------
    path : Path or None
        The database's file; made when missing. A damaged one is set aside as ``*.damaged``.
    """

    def __init__(self, path: Path | None) -> None:
        self._path = path
        self._database = None if path is None else self._open(path)

    @staticmethod
    def _open(path: Path) -> sqlite3.Connection:
        try:
            return _connect(path)
        except sqlite3.DatabaseError:
            try:
                path.replace(path.with_name(path.name + ".damaged"))
                return _connect(path)
            except (OSError, sqlite3.Error) as error:
                raise OutputError(
                    f"{path}: kept results cannot be opened: {error}; remove the file"
                ) from error

    def get(self, key: str) -> dict[str, NDArray[Any]] | None:
        """Return the arrays kept under `key`, or None."""
        if self._database is None:
            return None
        row = self._database.execute("SELECT arrays FROM done WHERE key = ?", (key,)).fetchone()
        if row is None:
            return None
        with np.load(io.BytesIO(row[0])) as kept:
            return dict(kept)

    def put(self, key: str, arrays: dict[str, NDArray[Any]]) -> None:
        """Keep `arrays` under `key`; safe on disk when the call returns. Raises `OutputError`."""
        if self._database is None:
            return
        buffer = io.BytesIO()
        np.savez_compressed(buffer, **arrays)  # type: ignore[arg-type]
        try:
            with self._database:
                self._database.execute(
                    "INSERT OR REPLACE INTO done VALUES (?, ?)", (key, buffer.getvalue())
                )
        except sqlite3.Error as error:
            raise OutputError(f"{self._path}: results cannot be kept: {error}") from error

    def close(self) -> None:
        """Close the database."""
        if self._database is not None:
            with contextlib.suppress(sqlite3.Error):
                self._database.close()


def _connect(path: Path) -> sqlite3.Connection:
    database = sqlite3.connect(path, timeout=30.0)
    database.execute("PRAGMA journal_mode = WAL")
    database.execute("CREATE TABLE IF NOT EXISTS done (key TEXT PRIMARY KEY, arrays BLOB)")
    database.execute("SELECT count(*) FROM done").fetchone()
    return database
