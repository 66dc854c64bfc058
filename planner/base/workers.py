"""Spreading independent tasks over processes: same results for any number of workers."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from multiprocessing import get_context
from typing import TypeVar

__all__ = ["each"]

Task = TypeVar("Task")
Result = TypeVar("Result")


def each(
    work: Callable[[Task], Result], tasks: Sequence[Task], workers: int
) -> Iterator[tuple[int, Result]]:
    """Yield ``(index, work(task))`` for every task, in the order in which they finish.

    Parameters
    ----------
    work : callable
        A function at module level (it is sent to other processes).
    tasks : sequence
        Picklable task descriptions; a result may depend on nothing but its task.
    workers : int
        Number of processes; 1 works in this process.

    Notes
    -----
    At most a few tasks per worker wait in the queue, so that an interruption (Ctrl-C, or the
    consumer closing this generator) ends soon.
    """
    if workers <= 1 or len(tasks) <= 1:
        for index, task in enumerate(tasks):
            yield index, work(task)
        return
    pool = ProcessPoolExecutor(min(workers, len(tasks)), mp_context=get_context("spawn"))
    try:
        waiting: dict[Future[Result], int] = {}
        todo = iter(enumerate(tasks))
        for index, task in todo:
            waiting[pool.submit(work, task)] = index
            if len(waiting) >= 2 * workers:
                break
        while waiting:
            done, _ = wait(waiting, return_when=FIRST_COMPLETED)
            for future in done:
                yield waiting.pop(future), future.result()
                for index, task in todo:
                    waiting[pool.submit(work, task)] = index
                    break
    finally:
        pool.shutdown(wait=True, cancel_futures=True)
