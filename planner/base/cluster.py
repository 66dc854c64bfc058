"""A Dask cluster that does batches of tasks; its package is imported only when one is asked for."""

from __future__ import annotations

import contextlib
import logging
import threading
import time
from collections.abc import Callable
from concurrent.futures import BrokenExecutor, Future
from typing import Any

from planner.base.batches import Batch, run_batch
from planner.base.errors import InputError, PlannerError
from planner.base.process import uninterrupted

__all__ = ["Cluster"]

CONNECT_S = 10.0
CANCEL_S = 0.4
"""How long a scheduler is waited for when its work is given up."""
CENSUS_S = 5.0
"""How often a cluster is asked for its threads."""
DESERTED_S = 120.0
"""How long a cluster may be without workers."""


class Cluster:
    """The workers of a running Dask scheduler."""

    def __init__(self, address: str) -> None:
        self.name = f"the workers of the cluster at {address}"
        self._address = address
        self._slots, self._asked_s, self._peopled_s = 1, -CENSUS_S, time.monotonic()
        self._client: Any = None
        self._theirs: set[Any] = set()
        self._connect()

    def _connect(self) -> None:
        try:
            import dask
            import distributed
        except ImportError as error:
            raise InputError(
                "a cluster needs the package `distributed`; install it by "
                "`pip install '.[cluster]'`"
            ) from error
        dask.config.set({"distributed.admin.large-graph-warning-threshold": "1GB"})
        # What they tell at length, one message here says; each logger has a level of its own.
        for name in list(logging.root.manager.loggerDict):
            if name.split(".")[0] in {"distributed", "tornado"}:
                logging.getLogger(name).setLevel(logging.CRITICAL + 1)
        try:
            self._client = distributed.Client(
                self._address, timeout=CONNECT_S, set_as_default=False
            )
        # AssertionError: its event loop did not start in time, as on a machine with no time left.
        except (OSError, ValueError, TypeError, AssertionError) as error:
            raise InputError(
                f"no Dask scheduler answers at {self._address}; start one by `dask scheduler`, "
                "or give the address that it prints"
            ) from error

    def slots(self) -> int:
        """Return how many batches are done at once; it changes as workers come and go.

        Raises `PlannerError` where there have been none for long.
        """
        now = time.monotonic()
        if self._client is None:
            self._connect()
        if now - self._asked_s > CENSUS_S:
            self._asked_s = now
            try:
                threads = sum(self._client.nthreads(callback_timeout=CENSUS_S).values())
            except OSError:  # not to be reached just now; a lost scheduler is found elsewhere
                return self._slots
            self._slots = max(1, threads)
            if threads:
                self._peopled_s = now
            elif now - self._peopled_s > DESERTED_S:
                raise PlannerError(
                    f"the cluster at {self._address} has had no workers for {DESERTED_S:.0f} s; "
                    f"start some by `dask worker {self._address}`"
                )
        return self._slots

    @staticmethod
    def pack(batch: Any) -> bytes:
        """Return a function and its tasks as they are sent.

        Functions of the running script go by value, as workers do not have the script.
        """
        from distributed.protocol.pickle import dumps

        packed: bytes = dumps(batch)
        return packed

    def submit(self, packed: bytes) -> Future[Batch]:
        """Send a batch."""
        if self.is_dead():
            raise BrokenExecutor("the scheduler was lost")
        client = self._client
        theirs = client.submit(run_batch, packed, pure=False)
        mine: Future[Batch] = Future()

        # Dask's own executor leaves a future pending for ever when the scheduler is lost just as
        # its result is fetched.
        async def follow() -> None:
            try:
                mine.set_result(await client.gather(theirs, asynchronous=True))
            except BaseException as error:  # noqa: BLE001
                lost = BrokenExecutor(str(error))  # cancelled by the client itself
                mine.set_exception(error if isinstance(error, Exception) else lost)
            self._theirs.discard(theirs)

        self._theirs.add(theirs)
        client.loop.add_callback(follow)
        return mine

    def is_dead(self) -> bool:
        """Say whether the scheduler was lost."""
        return self._client is None or self._client.status not in {"running", "connecting"}

    @staticmethod
    def is_loss(error: Exception) -> bool:
        """Say whether an error means that workers died more often than Dask puts up with."""
        from distributed import KilledWorker
        from distributed.comm.core import CommClosedError

        return isinstance(error, (KilledWorker, CommClosedError))

    def renew(self) -> bool:
        """Connect again where the scheduler was lost; True: whatever was on its way is lost."""
        if not self.is_dead():
            return False
        self.close()
        self._connect()
        return True

    def abandon(self) -> None:
        """Cancel whatever is on its way; a task at work is finished, for nobody."""
        client, theirs = self._client, list(self._theirs)
        self._theirs.clear()
        if client is not None and theirs:
            with uninterrupted():
                _for_at_most(CANCEL_S, lambda: client.cancel(theirs))

    def close(self) -> None:
        """Leave the cluster; its workers go on for others."""
        self.abandon()
        client, self._client = self._client, None
        if client is not None:
            with uninterrupted():
                _for_at_most(CANCEL_S, lambda: client.close(timeout=CANCEL_S))


def _for_at_most(seconds: float, act: Callable[[], object]) -> None:
    """Do something that a lost scheduler may never answer."""

    def try_it() -> None:
        with contextlib.suppress(Exception):
            act()

    thread = threading.Thread(target=try_it, daemon=True)
    thread.start()
    thread.join(seconds)
