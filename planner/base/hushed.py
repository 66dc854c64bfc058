"""Keeping compiled libraries from printing into our results."""

from __future__ import annotations

import ctypes
import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager

__all__ = ["hushed"]


@contextmanager
def hushed() -> Iterator[None]:
    """Let nothing reach standard output, whatever language prints it."""
    sys.stdout.flush()
    kept, nowhere = os.dup(1), os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, 1)
    try:
        yield
    finally:
        ctypes.CDLL(None).fflush(None)  # what C still holds back must go nowhere too
        os.dup2(kept, 1)
        os.close(kept)
        os.close(nowhere)
