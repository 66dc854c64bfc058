"""What spreading tasks costs; run as ``python bench_workers.py [SECONDS_OF_WORK]``.

Prints wall x slots / sum of the work, for two processes and for a Dask cluster of three on this
machine, with tasks of 2, 20 and 200 ms: once with 100 kB of arguments that are each task's own,
once with 100 kB that all tasks share. 1 is perfect. Tasks sleep, so that the figures do not depend
on the number of cores; what sending them costs in time of the processor is in the wall all the
same. Processes and connections are started before the clock.
"""

import contextlib
import subprocess
import sys
import sysconfig
import time
from pathlib import Path

import numpy as np

from planner.base.workers import Workers

ARGUMENT_BYTES = 100_000
PROCESSES = 2
CLUSTER = 3
PORT = 28_801


def nap(task):
    """Take so long; return a little."""
    seconds, argument = task
    end = time.perf_counter() + seconds
    time.sleep(max(0.0, seconds - 0.0005))
    while time.perf_counter() < end:
        pass
    return float(argument[0])


def ratio(workers, slots, seconds, work_s, shared):
    """Return wall x slots / work."""
    count = int(work_s * slots / seconds)
    rng = np.random.default_rng(0)
    one = rng.random(ARGUMENT_BYTES // 8)
    tasks = [(seconds, one if shared else one + i) for i in range(count)]
    start = time.perf_counter()
    done = sum(1 for _ in workers.each(nap, tasks))
    assert done == count
    return (time.perf_counter() - start) * slots / (count * seconds)


def measure(workers, slots, work_s):
    list(workers.each(nap, [(0.2, np.zeros(9))] * (4 * slots)))  # all are there
    for seconds in (0.002, 0.02, 0.2):
        own, shared = (ratio(workers, slots, seconds, work_s, s) for s in (False, True))
        print(f"  {1e3 * seconds:3.0f} ms   own arguments {own:.3f}   shared {shared:.3f}")


@contextlib.contextmanager
def cluster():
    """Give the address of a scheduler with three workers of one thread each."""
    dask = str(Path(sysconfig.get_path("scripts")) / "dask")
    address = f"tcp://127.0.0.1:{PORT}"
    commands = [
        [dask, "scheduler", "--host", "127.0.0.1", "--port", str(PORT), "--no-dashboard"],
        [dask, "worker", address, "--nworkers", str(CLUSTER), "--nthreads", "1", "--no-dashboard"],
    ]
    with contextlib.ExitStack() as stack:
        for command in commands:
            process = stack.enter_context(subprocess.Popen(command, stderr=subprocess.DEVNULL))
            stack.callback(process.terminate)
        yield address


def main(work_s=10.0):
    print(f"{PROCESSES} processes")
    with Workers(PROCESSES) as workers:
        measure(workers, PROCESSES, work_s)
    print(f"Dask cluster of {CLUSTER}")
    with cluster() as address, Workers(cluster=address) as workers:
        time.sleep(8.0)
        measure(workers, CLUSTER, work_s)


if __name__ == "__main__":
    main(*(float(argument) for argument in sys.argv[1:]))
