"""Child processes that do batches of tasks, and can be ended at any moment."""

from __future__ import annotations

import os
import pickle
import signal
import threading
import time
from concurrent.futures import Future, ProcessPoolExecutor
from multiprocessing import connection, parent_process
from multiprocessing.context import SpawnContext
from multiprocessing.process import BaseProcess
from typing import Any

from planner.base.batches import Batch, run_batch
from planner.base.process import one_thread, one_thread_environment, uninterrupted

__all__ = ["Pool"]

KILL_S = 0.4
"""Time that children have to end by themselves."""


class Pool:
    """Children of this process, started when they are first needed."""

    name = "worker processes"

    def __init__(self, count: int) -> None:
        self._count = count
        self._context = _Context()
        self._pool: ProcessPoolExecutor | None = None

    def slots(self) -> int:
        """Return how many batches are done at once."""
        return self._count

    @staticmethod
    def pack(batch: Any) -> bytes:
        """Return a function and its tasks as they are sent: what tasks share is sent once."""
        return pickle.dumps(batch, pickle.HIGHEST_PROTOCOL)

    def submit(self, packed: bytes) -> Future[Batch]:
        """Send a batch. Raises `BrokenProcessPool`."""
        if self._pool is None:
            self._pool = ProcessPoolExecutor(
                self._count, mp_context=self._context, initializer=_begin_child
            )
        if len(self._context.children) == self._count:
            return self._pool.submit(run_batch, packed)
        # Once more within: making the pool starts a helper of multiprocessing, and that lets
        # interruptions in again (CPython's resource tracker).
        with uninterrupted(), one_thread_environment():
            return self._pool.submit(run_batch, packed)

    def is_dead(self) -> bool:
        """Say whether a child has died; a pool hangs if that happens while it sends its result."""
        return bool(connection.wait([c.sentinel for c in self._context.children], timeout=0))

    @staticmethod
    def is_loss(error: Exception) -> bool:
        """Say whether an error means a lost worker, beside those of `concurrent.futures`."""
        return False

    def renew(self) -> bool:
        """Make room for new children; True: whatever was on its way is lost."""
        self.close()
        return True

    def abandon(self) -> None:
        """Give up whatever is on its way."""
        self.close()

    def close(self) -> None:
        """End the children, whatever they do."""
        if self._pool is None:
            return
        pool, self._pool = self._pool, None
        answers: Any = pool._result_queue
        with uninterrupted():
            for child in self._context.children:
                child.terminate()
            end = time.monotonic() + KILL_S
            for child in self._context.children:
                child.join(max(0.0, end - time.monotonic()))
            for child in self._context.children:
                child.kill()
            # The pool's own thread may be waiting for the rest of an answer that never comes.
            answers._writer.close()
            pool.shutdown(wait=False, cancel_futures=True)
            self._context = _Context()


class _Context(SpawnContext):
    """Spawns children, and remembers them, so that they can be ended."""

    def __init__(self) -> None:
        self.children: list[BaseProcess] = []

    def Process(self, *arguments: Any, **options: Any) -> BaseProcess:  # type: ignore[override] # noqa: N802
        child = SpawnContext.Process(*arguments, **options)
        self.children.append(child)
        return child


def _begin_child() -> None:
    """Make a child ready: the parent alone answers Ctrl-C, and none outlives the parent."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    one_thread.__enter__()
    threading.Thread(target=_end_with_parent, daemon=True).start()


def _end_with_parent() -> None:
    parent = parent_process()
    if parent is not None:
        parent.join()
        os._exit(1)
