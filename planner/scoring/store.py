"""Results kept on disk, so that an interrupted run goes on where it stopped."""

from __future__ import annotations

import contextlib
import hashlib
import pickle
import sqlite3
import sys
import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from functools import partial
from pathlib import Path
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import OutputError
from planner.scoring.rows import packed, unpacked

__all__ = ["Digests", "Store", "digest_of", "key_of"]

Arrays = dict[str, NDArray[Any]]
Answer = TypeVar("Answer")

LAYOUT = 2
"""Raised whenever the table or its rows change; rows of another layout are of no use."""
LOCKED_S = 30.0
TRY_S = 0.2
"""How long SQLite itself waits for a lock; Ctrl-C is not heard before."""
AT_ONCE = 500
"""Keys in one question."""

BUSY = {sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED}
# A wrong statement (ERROR) is a table that is not ours, as the statements here are right.
DAMAGED = {
    sqlite3.SQLITE_CORRUPT,
    sqlite3.SQLITE_NOTADB,
    sqlite3.SQLITE_ERROR,
    sqlite3.SQLITE_FORMAT,
    sqlite3.SQLITE_SCHEMA,
    sqlite3.SQLITE_MISMATCH,
    sqlite3.SQLITE_CONSTRAINT,
    sqlite3.SQLITE_INTERNAL,
}
UNWRITABLE = {sqlite3.SQLITE_READONLY, sqlite3.SQLITE_CANTOPEN, sqlite3.SQLITE_PERM}


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


def digest_of(record: Any) -> str:
    """Return a record's own key, which can stand for it in the keys of the tasks that share it."""
    return key_of(record)


class Digests:
    """Digests of records that many tasks share, each worked out once.

    For the length of one piece of work, in which no record changes: a record that was met before
    is known by its identity. Records are held, so that no other can come to stand in their place.
    """

    def __init__(self) -> None:
        self._known: dict[int, tuple[Any, str]] = {}

    def of(self, record: Any) -> str:
        """Return ``digest_of(record)``."""
        known = self._known.get(id(record))
        if known is None:
            known = self._known[id(record)] = (record, digest_of(record))
        return known[1]


def _to_stderr(message: str) -> None:
    sys.stderr.write(f"planner: {message}\n")


class Store:
    """An embedded database of finished tasks, one row each; ``Store(None)`` keeps nothing.

    Parameters
    ----------
    path : Path or None
        The database's file; made when missing. Several processes may use one file, and other
        programs may read it.
    warn : callable
        Told in one sentence when a damaged file was set aside as ``NAME.damaged``; the store then
        goes on with a fresh one.
    locked_s : float
        How long to wait while another process holds the file.

    Raises
    ------
    OutputError
        By every method, when the file cannot be used: held by another process, disk full, folder
        missing. What was put before stays safe.

    Notes
    -----
    What was put is safe from the end of this process, however it ends: a commit has written to
    SQLite's write-ahead log, and what was written stays in the system's care without the process.
    ``synchronous = NORMAL`` does not wait for the disk at each commit; a loss of power may take the
    last commits, which cost their work again, but leaves the rest whole.
    """

    def __init__(
        self,
        path: Path | None,
        warn: Callable[[str], None] = _to_stderr,
        locked_s: float = LOCKED_S,
    ) -> None:
        self._path = path
        self._warn = warn
        self._locked_s = locked_s
        self._database: sqlite3.Connection | None = None
        self._place: tuple[int, int] | None = None
        self._unwritable = ""
        if path is not None:
            self._do(lambda _: None)

    def get_many(self, keys: Sequence[str]) -> dict[str, Arrays]:
        """Return the arrays kept under each key, where there are any."""
        found: dict[str, Arrays] = {}
        for first in range(0, len(keys), AT_ONCE):
            for key, blob in self._do(partial(_rows, keys[first : first + AT_ONCE])) or []:
                arrays = unpacked(key, blob)
                if arrays is not None:
                    found[key] = arrays
        return found

    def put_many(self, results: Mapping[str, Mapping[str, NDArray[Any]]]) -> None:
        """Keep all results, each under its key; safe when the call returns, all or none."""
        rows = [(key, packed(key, arrays)) for key, arrays in results.items()]
        if not rows or self._path is None:
            return

        def put(database: sqlite3.Connection) -> None:
            if self._unwritable:
                raise OutputError(self._unwritable)
            with _transaction(database):
                database.executemany("INSERT OR REPLACE INTO done VALUES (?, ?)", rows)

        self._do(put)

    def get(self, key: str) -> Arrays | None:
        """Return the arrays kept under `key`, or None."""
        return self.get_many([key]).get(key)

    def put(self, key: str, arrays: Mapping[str, NDArray[Any]]) -> None:
        """Keep `arrays` under `key`; safe when the call returns."""
        self.put_many({key: arrays})

    def close(self) -> None:
        """Close the database; another call opens it again."""
        database, self._database = self._database, None
        if database is not None:
            with contextlib.suppress(sqlite3.Error):
                database.close()

    def _do(self, act: Callable[[sqlite3.Connection], Answer]) -> Answer | None:
        """Act on the database, opened where need be; wait for locks, set damage aside."""
        if self._path is None:
            return None
        end = time.monotonic() + self._locked_s
        set_aside = 0
        while True:
            try:
                return act(self._opened(self._path))
            except sqlite3.Error as error:
                code = getattr(error, "sqlite_errorcode", sqlite3.SQLITE_CORRUPT) & 0xFF
                if code in BUSY:
                    if time.monotonic() > end:
                        raise OutputError(
                            f"{self._path}: another process has held this file for "
                            f"{self._locked_s:.0f} s; wait until it has ended, or end it, and "
                            "start again; what is in the file is kept"
                        ) from error
                    time.sleep(0.01)
                elif code in DAMAGED and set_aside < 2:
                    set_aside += 1
                    self._set_aside(self._path, str(error))
                else:
                    raise OutputError(
                        f"{self._path}: results cannot be kept: {error}; what was kept before is "
                        "safe; see to disk space and permissions, and start again"
                    ) from error

    def _opened(self, path: Path) -> sqlite3.Connection:
        """Return the connection, made anew when another process has replaced the file."""
        if self._database is not None and _place(path) != self._place:
            self.close()
        if self._database is None:
            if not path.parent.is_dir():
                raise OutputError(f"{path}: cannot be opened: there is no folder {path.parent}")
            if path.exists() and not path.is_file():
                self._set_aside(path, "not a file")
            self._place = _place(path)
            self._unwritable = ""
            try:
                self._database = _connect(path)
            except sqlite3.OperationalError as error:
                if error.sqlite_errorcode & 0xFF not in UNWRITABLE or not path.is_file():
                    raise
                self._unwritable = f"{path}: results cannot be kept: {error}; see to permissions"
                self._database = _connect_to_read(path)
            self._place = _place(path)
        return self._database

    def _set_aside(self, path: Path, reason: str) -> None:
        """Move a damaged file, and what SQLite keeps beside it, out of the way."""
        self.close()
        if self._place is not None and _place(path) != self._place:
            return  # another process has done so
        aside, number = path.with_name(f"{path.name}.damaged"), 1
        while aside.exists():
            number += 1
            aside = path.with_name(f"{path.name}.damaged{number}")
        try:
            # The log first: a fresh file must never meet the log of another.
            for end in ("-wal", "-shm", ""):
                old = path.with_name(path.name + end)
                if old.exists():
                    old.rename(aside.with_name(aside.name + end))
        except OSError as error:
            raise OutputError(
                f"{path}: is damaged ({reason}) and cannot be renamed: {error.strerror}; "
                "remove the file"
            ) from error
        self._warn(
            f"{path}: kept results are damaged ({reason}); set aside as {aside.name}, what it "
            "held is worked out again"
        )


def _place(path: Path) -> tuple[int, int] | None:
    """Return what tells a file from another of the same name."""
    try:
        status = path.stat()
    except OSError:
        return None
    return status.st_dev, status.st_ino


def _connect(path: Path) -> sqlite3.Connection:
    database = sqlite3.connect(path, timeout=TRY_S, isolation_level=None)
    try:
        database.text_factory = _text
        database.execute("PRAGMA journal_mode = WAL")
        database.execute("PRAGMA synchronous = NORMAL")
        if _layout(database) != LAYOUT:
            with _transaction(database):
                if _layout(database) != LAYOUT:  # another process may have been first
                    database.execute("DROP TABLE IF EXISTS done")
                    database.execute("CREATE TABLE done (key TEXT PRIMARY KEY, arrays BLOB)")
                    database.execute(f"PRAGMA user_version = {LAYOUT}")
        database.execute("SELECT key, arrays FROM done LIMIT 1").fetchall()
    except BaseException:
        database.close()
        raise
    return database


def _connect_to_read(path: Path) -> sqlite3.Connection:
    """Open a file that cannot be written: as it is, without the log that would have to be made."""
    address = f"{path.absolute().as_uri()}?mode=ro&immutable=1"
    database = sqlite3.connect(address, uri=True, timeout=TRY_S, isolation_level=None)
    try:
        database.text_factory = _text
        if _layout(database) != LAYOUT:
            raise OutputError(f"{path}: results cannot be kept: the file cannot be written")
    except BaseException:
        database.close()
        raise
    return database


def _rows(keys: Sequence[str], database: sqlite3.Connection) -> list[tuple[str, Any]]:
    marks = ",".join("?" * len(keys))
    asked = database.execute(f"SELECT key, arrays FROM done WHERE key IN ({marks})", keys)
    return asked.fetchall()


def _layout(database: sqlite3.Connection) -> int:
    found: int = database.execute("PRAGMA user_version").fetchone()[0]
    return found


def _text(content: bytes) -> str:
    return content.decode(errors="replace")


@contextlib.contextmanager
def _transaction(database: sqlite3.Connection) -> Iterator[None]:
    """Write all or nothing. The lock is taken at once: one that grows midway can be refused."""
    database.execute("BEGIN IMMEDIATE")
    try:
        yield
        database.execute("COMMIT")
    except BaseException:
        with contextlib.suppress(sqlite3.Error):
            database.execute("ROLLBACK")
        raise
