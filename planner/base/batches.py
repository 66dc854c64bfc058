"""Several tasks done in one go, in whatever process: what a worker is sent."""

from __future__ import annotations

import pickle
import time
from typing import Any

from planner.base.process import one_thread

__all__ = ["Batch", "run_batch"]

Batch = tuple[list[Any], float]
"""Results, and the seconds that the work took."""


def run_batch(packed: bytes) -> Batch:
    """Do a batch of tasks, in whatever process; return the results and the seconds of work."""
    work, tasks = pickle.loads(packed)
    with one_thread:
        start = time.perf_counter()
        try:
            results = [work(task) for task in tasks]
        except Exception as error:
            # What cannot travel would look like a dead worker to the parent.
            try:
                pickle.loads(pickle.dumps(error))
            except Exception:  # noqa: BLE001
                raise RuntimeError(f"{type(error).__name__}: {error}") from None
            raise
        return results, time.perf_counter() - start
