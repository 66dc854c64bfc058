"""Tasks for the tests of workers: at module level, in a file that other processes can import."""

import os
import signal
import threading
import time
from pathlib import Path

import numpy as np


class FussyError(Exception):
    """An error that cannot be unpickled."""

    def __init__(self, one, two):
        super().__init__(f"{one} and {two}")


def nap(seconds):
    time.sleep(seconds)
    return os.getpid()


def where(_):
    return os.getpid(), str(Path.cwd())


def raise_at_five(number):
    if number == 5:
        raise ValueError("five", number)
    return number


def raise_fussily(number):
    raise FussyError(number, number)


def die_once(task):
    """Kill the worker the first time that a marked task is met."""
    number, mark = task
    if mark and not Path(mark).exists():
        Path(mark).touch()
        os.kill(os.getpid(), signal.SIGKILL)
    return number


def die(number):
    if number == 3:
        os.kill(os.getpid(), signal.SIGKILL)
    return number


def threads(_):
    """Return what linear algebra may use here, and what new libraries would."""
    from threadpoolctl import threadpool_info

    return [i["num_threads"] for i in threadpool_info()], os.environ.get("OPENBLAS_NUM_THREADS")


def product(seed):
    """Return bytes that could depend on the number of threads, and so could a solution."""
    a = np.random.default_rng(seed).random((150, 150))
    return np.linalg.solve(a @ a.T, a[0]).tobytes()


def total(task):
    number, array = task
    return number + float(array.sum())


def ignores_interrupts(_):
    return signal.getsignal(signal.SIGINT) == signal.SIG_IGN


def interrupt_parent_then_nap(seconds):
    os.kill(os.getppid(), signal.SIGINT)
    time.sleep(seconds)


def die_while_sending(_):
    """Let a result be half sent when the worker is killed."""
    threading.Timer(0.3, os.kill, (os.getpid(), signal.SIGKILL)).start()
    return Slow()


class Slow:
    """Sends a part of itself, and then the worker is dead before the rest."""

    def __reduce__(self):
        time.sleep(1.0)
        return (Slow, ())
