"""Spreading independent tasks over processes: same results for any number of workers.

`Workers` hides where the work is done: in this process, in children of it, or on a Dask cluster.
The last two are a `concurrent.futures.Executor` each, and one loop feeds either.
"""

from __future__ import annotations

import contextlib
from collections import deque
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import BrokenExecutor, CancelledError, Future
from queue import Empty, SimpleQueue
from types import TracebackType
from typing import Any, TypeVar

from planner.base.batches import Batch
from planner.base.children import Pool
from planner.base.cluster import Cluster
from planner.base.errors import PlannerError
from planner.base.process import one_thread, uninterrupted

__all__ = ["Workers"]

Task = TypeVar("Task")
Result = TypeVar("Result")

BATCH_S = 0.3
"""Work in one batch: a hundred times what sending it costs, yet soon finished."""
BATCH_BYTES = 4_000_000
"""Arguments in one batch, about; more would hold up the sending of others."""
AHEAD = 3
"""Batches on their way for each worker slot: one at work, the others so that none waits."""
RETRIES = 3
"""Times that lost work is done again before any of it is finished."""
LOOK_S = 1.0
"""How often a silent pool is looked at."""


class Workers:
    """Something that does independent tasks; a context manager.

    Parameters
    ----------
    count : int
        Number of processes; 1 works in this process. Children are started when they are first
        needed and live until `close`.
    cluster : str, optional
        Address of a running Dask scheduler, such as ``tcp://host:8786``; then `count` does not
        matter. Its workers need this package installed.

    Raises
    ------
    InputError
        Without the package ``distributed``, or when nobody answers at the address.

    Notes
    -----
    Linear algebra is held to one thread wherever a task runs: its results may depend, in their
    last bits, on the number of threads.
    """

    def __init__(self, count: int = 1, cluster: str | None = None) -> None:
        self._crew: Pool | Cluster | None = None
        if cluster is not None:
            self._crew = Cluster(cluster)
        elif count > 1:
            self._crew = Pool(count)

    def each(
        self, work: Callable[[Task], Result], tasks: Sequence[Task]
    ) -> Iterator[tuple[int, Result]]:
        """Yield ``(index, work(task))`` for every task, in the order in which they finish.

        Parameters
        ----------
        work : callable
            A function at module level (it is sent to other processes).
        tasks : sequence
            Picklable task descriptions; a result may depend on nothing but its task.

        Raises
        ------
        PlannerError
            When workers die again and again, or a cluster stays without any.
        Exception
            Whatever `work` raises; the other tasks are then given up.

        Notes
        -----
        When the consumer is interrupted or closes the generator, children are killed and tasks on
        a cluster cancelled, and the object can be used again.
        """
        if self._crew is None or (len(tasks) == 1 and isinstance(self._crew, Pool)):
            return _here(work, tasks)
        return _Round(self._crew, work, tasks).results()

    def close(self) -> None:
        """Let the workers go, at work or not. Work can be given to the object again after it."""
        if self._crew is not None:
            self._crew.close()

    def __enter__(self) -> Workers:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()


def _here(work: Callable[[Task], Result], tasks: Sequence[Task]) -> Iterator[tuple[int, Result]]:
    for index, task in enumerate(tasks):
        with one_thread:
            result = work(task)
        yield index, result


class _Round:
    """One call of `Workers.each`: what is to do, what is on its way, what came back."""

    def __init__(
        self, crew: Pool | Cluster, work: Callable[[Task], Result], tasks: Sequence[Task]
    ) -> None:
        self._crew, self._work, self._tasks = crew, work, tasks
        self._todo = deque(range(len(tasks)))
        self._waiting: dict[Future[Batch], list[int]] = {}
        # Futures report themselves here: an interruption inside concurrent.futures.wait could
        # leave a future locked and its pool hanging.
        self._done: SimpleQueue[Future[Batch]] = SimpleQueue()
        self._back: deque[tuple[int, Any]] = deque()
        self._task_s: float | None = None
        self._task_bytes = 1.0
        self._losses = 0

    def results(self) -> Iterator[tuple[int, Any]]:
        try:
            while self._todo or self._waiting or self._back:
                self._send()
                while self._back:
                    yield self._back.popleft()
                if self._waiting:
                    self._receive()
        finally:
            if self._waiting:
                self._crew.abandon()

    def _send(self) -> None:
        slots = self._crew.slots()
        while self._todo and len(self._waiting) < AHEAD * slots:
            batch = [self._todo.popleft() for _ in range(self._size(slots))]
            packed = self._crew.pack((self._work, [self._tasks[i] for i in batch]))
            self._task_bytes = len(packed) / len(batch)
            # Interrupted between the two steps, a batch would run on unseen.
            with uninterrupted():
                try:
                    future = self._crew.submit(packed)
                except BrokenExecutor as error:
                    self._todo.extendleft(reversed(batch))
                    return self._lose(error)
                self._waiting[future] = batch
                future.add_done_callback(self._done.put)
        return None

    def _size(self, slots: int) -> int:
        """Return how many tasks make a batch; few near the end, so that all end together."""
        if self._task_s is None:
            return 1
        wanted = min(BATCH_S / max(self._task_s, 1e-6), BATCH_BYTES / self._task_bytes)
        return max(1, min(int(wanted), len(self._todo) // (4 * slots)))

    def _receive(self) -> None:
        """Wait for a finished batch, and take all that are there."""
        try:
            finished = [self._done.get(timeout=LOOK_S)]
        except Empty:
            if self._crew.is_dead():
                self._lose(None)
            return
        with contextlib.suppress(Empty):
            while True:
                finished.append(self._done.get_nowait())
        lost: BaseException | None = None
        for future in finished:
            if future not in self._waiting:  # of a pool that was given up
                continue
            try:
                results, seconds = future.result()
            except (BrokenExecutor, CancelledError) as error:
                lost = error
            except Exception as error:
                if not self._crew.is_loss(error):
                    raise
                lost = error
            else:
                batch = self._waiting.pop(future)
                self._back.extend(zip(batch, results, strict=True))
                mine = seconds / len(batch)
                self._task_s = mine if self._task_s is None else 0.5 * (self._task_s + mine)
                self._losses = 0
                continue
            self._todo.extendleft(reversed(self._waiting.pop(future)))
        if lost is not None:
            self._lose(lost)

    def _lose(self, error: BaseException | None) -> None:
        """Go on after workers have died, unless they do so again and again."""
        self._losses += 1
        if self._losses > RETRIES:
            raise PlannerError(
                f"{self._crew.name} died {self._losses} times without finishing a task; is there "
                "too little memory? Fewer workers need less. What was finished before is kept"
            ) from error
        if self._crew.renew():
            for batch in reversed(self._waiting.values()):
                self._todo.extendleft(reversed(batch))
            self._waiting.clear()
