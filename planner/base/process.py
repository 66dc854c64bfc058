"""What holds for a whole process: its answer to Ctrl-C, its threads of linear algebra."""

from __future__ import annotations

import contextlib
import os
import signal
import sys
import threading
from collections.abc import Iterator
from typing import Any

__all__ = ["one_thread", "one_thread_environment", "uninterrupted"]

THREADS = (
    "OMP_NUM_THREADS",
    "OPENBLAS_NUM_THREADS",
    "MKL_NUM_THREADS",
    "BLIS_NUM_THREADS",
    "VECLIB_MAXIMUM_THREADS",
)


@contextlib.contextmanager
def uninterrupted() -> Iterator[None]:
    """Put off Ctrl-C; processes and threads that are started within never see it."""
    came: list[int] = []
    is_main = threading.current_thread() is threading.main_thread()
    blocked = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    # Another thread may take the signal in spite of the mask, and Python then interrupts this one.
    handler = signal.signal(signal.SIGINT, lambda *_: came.append(1)) if is_main else None
    try:
        yield
    finally:
        if is_main:
            signal.signal(signal.SIGINT, handler)
        signal.pthread_sigmask(signal.SIG_SETMASK, blocked)
        if came:
            signal.raise_signal(signal.SIGINT)


@contextlib.contextmanager
def one_thread_environment() -> Iterator[None]:
    """Let libraries that are loaded within, here or in a new child, start with one thread."""
    before = {name: os.environ.get(name) for name in THREADS}
    os.environ.update(dict.fromkeys(THREADS, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                del os.environ[name]
            else:
                os.environ[name] = value


class _OneThread:
    """Holds linear algebra to one thread while any thread of this process is within."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._within = 0
        self._undo = contextlib.ExitStack()
        self._control: Any = None
        self._modules = 0

    def __enter__(self) -> None:
        with self._lock:
            if self._within == 0:
                self._undo.enter_context(one_thread_environment())
                self._undo.enter_context(self._libraries().limit(limits=1))
            self._within += 1

    def __exit__(self, *_: object) -> None:
        with self._lock:
            self._within -= 1
            if self._within == 0:
                self._undo.close()

    def _libraries(self) -> Any:
        """Return control of the libraries; looking for them takes 7 ms, more than a short task."""
        if len(sys.modules) != self._modules:
            from threadpoolctl import ThreadpoolController

            self._control = ThreadpoolController()
            self._modules = len(sys.modules)
        return self._control


one_thread = _OneThread()
